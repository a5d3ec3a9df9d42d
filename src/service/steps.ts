import { filingSteps } from '../acquisition/filing.ts';
import { type LedgerStep, transactionSteps } from '../store/ledger-steps.ts';

/**
 * Names of the places between two outside effects. The service calls `step(name)` at each; in normal running it does
 * nothing, tests throw there or end the process there.
 */
export const stepNames = [
  'intake: attempt noted',
  'intake: recording read',
  'intake: decision begun',
  'intake: decision committed',
  'intake: filing noted',
  ...filingSteps,
  'intake: filing committed',
  'delivery: message stored',
  'delivery: attempt begun',
  'delivery: answer received',
  'delivery: answer stored',
  'summary: stored',
  ...transactionSteps,
] as const;

/** Those of a start that brings an older ledger up to date are reached in no other life of the service. */
export type StepName = (typeof stepNames)[number] | LedgerStep;

export type Step = (name: StepName) => void;

export const noStep: Step = () => {};
