import { createMailer, type Mailer } from '../advisory/mailer.ts';
import type { MailServer } from '../config/site.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Clock } from './clock.ts';
import type { Complaints, Logger } from './log.ts';
import type { SiteView } from './site-view.ts';
import type { Step } from './steps.ts';

export type MailerFor = (server: MailServer) => Mailer;

/** What everything around mail works with. */
export interface MailTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly view: () => SiteView;
  readonly log: Logger;
  readonly complaints: Complaints;
  readonly step: Step;
  /** Wall time at which this run of the service began. */
  readonly startedMs: number;
  readonly mailerFor?: MailerFor;
  /** Recordings of a backlog are being evaluated: what they raised may be over in a moment and is not told yet. */
  readonly backlogRuns?: () => boolean;
}

export function mailerOf(tools: Pick<MailTools, 'mailerFor'>, server: MailServer): Mailer {
  return (tools.mailerFor ?? createMailer)(server);
}

/** Wall time in whole milliseconds, as the ledger keeps it. */
export function wallMsOf(clock: Clock): number {
  return Math.round(clock.wallMs());
}
