import { type StepName, stepNames } from '../../src/service/steps.ts';
import { otherFileSystem } from './story-run.ts';

/** Where the story is interrupted: every named step once, those of filing also with the data on another file system. */
export interface Interruption {
  readonly step: StepName;
  readonly shelf: string | null;
  readonly title: string;
}

/** Steps that are only reached where the data folder lies on another file system than the drop folder. */
const onlyAcross: readonly StepName[] = ['filing: copied', 'filing: original removed'];
/** Steps that differ there. */
const alsoAcross: readonly StepName[] = ['filing: in place', 'filing: sidecar in place'];

export const interruptions: readonly Interruption[] = [
  ...stepNames
    .filter((step) => !onlyAcross.includes(step))
    .map((step) => ({ step, shelf: null, title: step })),
  ...(otherFileSystem === null ? [] : [...onlyAcross, ...alsoAcross]).map((step) => ({
    step,
    shelf: otherFileSystem,
    title: `${step}, across file systems`,
  })),
];

/** What cannot be interrupted here, by name. */
export const leftOut: readonly string[] =
  otherFileSystem === null
    ? onlyAcross.map(
        (step) => `${step}: left out, /dev/shm is not another file system than the temporary folder`,
      )
    : [];

/** A mail that the server took and whose answer was not stored goes out again, with the same Message-ID. */
export const mayRepeatMails: readonly StepName[] = ['delivery: answer received'];
/** So it does when the transaction that would store the answer is broken off; other transactions repeat none. */
export const someRepeatMails: readonly StepName[] = ['transaction: before commit'];
