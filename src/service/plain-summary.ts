import type { Mail } from '../advisory/facts.ts';
import { plainNotice } from '../advisory/plain-notice.ts';
import { standingAlarms } from '../store/alarms.ts';
import { isLedgersOwn } from '../store/ledger-error.ts';
import { findMachine } from './fact-names.ts';
import type { MailTools } from './mail-tools.ts';
import { stackOf } from './plain-draft.ts';
import type { SiteView } from './site-view.ts';
import { standingOfLife } from './standing-facts.ts';

/** What stands, without figures: a morning without its summary would read as a morning without news. */
export interface PlainSummary {
  readonly facts: null;
  readonly mail: Mail;
  readonly html: string;
}

/** In place of a summary that could not be made; throws on what the ledger itself says. */
export async function plainSummary(
  { ledger, log }: MailTools,
  view: SiteView,
  error: unknown,
): Promise<PlainSummary> {
  if (isLedgersOwn(error)) throw error;
  log.error({ error: stackOf(error) }, 'the summary could not be made; sent as a plain list');
  const lives = await ledger.read(standingAlarms);
  const lines = lives.map((one) => {
    const { machineId } = one.alarm.subject;
    const machine = machineId === null ? null : (findMachine(view, machineId)?.name ?? machineId);
    return {
      number: one.life.number,
      severity: one.life.severity,
      about: [machine, one.alarm.key].filter((part) => part !== null).join(', '),
      event: standingOfLife(one).replaceAll('-', ' '),
      level: null,
    };
  });
  const mail = plainNotice(view.site.name, `summary: ${lines.length} stand`, lines, error);
  return { facts: null, mail, html: mail.html };
}
