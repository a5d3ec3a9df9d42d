import { standing } from '../../src/detection/alarm-state.ts';
import { actOnAlarm } from '../../src/service/acts-log.ts';
import type { AlarmOrder } from '../../src/service/alarm-command.ts';
import { putInService, takeOutOfService } from '../../src/service/place-service.ts';
import { suppressionNow } from '../../src/service/suppression-now.ts';
import { watchSuppressions } from '../../src/service/watch-suppressions.ts';
import { loadAllAlarms } from '../../src/store/alarms.ts';
import { type JournalRow, readJournal } from '../../src/store/journal.ts';
import { placesOutOfService } from '../../src/store/suppressions.ts';
import { beginMs, hourMs, MailBench } from '../service/mail-bench.ts';

/**
 * A pump and a blower, each with one point and one limit (alert 2.8, danger 4.5, both after one recording), and a fan that
 * the limits of both look at. Each line is one thing that happens, with the real ledger; its answer is what the journal
 * gets and whom it tells. A recording comes an hour after the one before.
 *
 *   pump 3.1                          a recording of the pump
 *   fan dead | fan well               its sensor gives no usable data; is mended
 *   shelve pump for 8 h               acknowledge pump, reset pump, unshelve pump likewise
 *   pump out of service for 3 d       ends at that time, or by: pump in service
 *   wait 8 h                          time passes; the service looks after itself
 *   the limit looks at the fan        begins anew: suppressed_while: trouble of fan/de
 *   where does it stand               what is not at rest, and what holds it back
 */
type Machine = 'pump' | 'blower';

const tree = { pump: { de: ['overall'] }, blower: { de: ['overall'] }, fan: { de: ['overall'] } };

export class HeldScenario {
  #bench: MailBench;
  #sequence = 0;

  private constructor(bench: MailBench) {
    this.#bench = bench;
  }

  static async begin(): Promise<HeldScenario> {
    return new HeldScenario(await MailBench.start({ tree }));
  }

  async end(): Promise<void> {
    await this.#bench.ledger.close();
  }

  async play(line: string): Promise<string> {
    const answers = await this.#act(line);
    const told = answers ?? (await this.#news());
    const hours = Math.round((this.#bench.clock.wallMs() - beginMs) / hourMs);
    const lines = told.length === 0 ? ['-'] : told;
    return `${`${hours} h`.padStart(5)}  ${line.padEnd(30)} | ${lines.join(`\n${' '.repeat(37)} | `)}`;
  }

  async #act(line: string): Promise<string[] | null> {
    const b = this.#bench;
    const level = /^(pump|blower) ([\d.]+)$/.exec(line);
    const fan = /^fan (dead|well)$/.exec(line);
    const wait = /^wait (\d+) (h|d)$/.exec(line);
    const act = /^(acknowledge|reset|unshelve|shelve) (pump|blower)(?: for (\d+) (h|d))?$/.exec(line);
    const place = /^(pump|blower) (out of|in) service(?: for (\d+) (h|d))?$/.exec(line);
    if (level !== null) {
      b.clock.advance(hourMs);
      await this.#look();
      await b.record(`${level[1]}/de`, { overall: Number(level[2]) });
    } else if (fan !== null) {
      await b.look('dead-sensor', fan[1] === 'dead', { machineId: 'fan', pointId: 'de' });
      await b.look('dead-sensor', fan[1] === 'dead', { machineId: 'fan', pointId: 'de' });
    } else if (wait !== null) b.clock.advance(msOf(wait[1], wait[2]));
    else if (act !== null) return this.#order(act[1] ?? '', act[2] as Machine, msOf(act[3], act[4]));
    else if (place !== null)
      return this.#place(place[1] as Machine, place[2] === 'in', msOf(place[3], place[4]));
    else if (line === 'where does it stand') return this.#standings();
    else if (line === 'the limit looks at the fan') {
      await this.end();
      const suppressedWhile = [{ by: 'trouble', machineId: 'fan', pointId: 'de' }] as const;
      this.#bench = await MailBench.start({ tree, limit: { suppressedWhile } });
      this.#sequence = 0;
    } else throw new Error(`no such line in a scenario: ${line}`);
    await this.#look();
    return null;
  }

  #look(): Promise<unknown> {
    return watchSuppressions(this.#bench.ledger, this.#bench.view, this.#bench.clock.wallMs());
  }

  async #order(kind: string, machine: Machine, forMs: number): Promise<string[] | null> {
    const b = this.#bench;
    const alarm = (await b.ledger.read(loadAllAlarms)).find(({ subject }) => subject.machineId === machine);
    const order = { kind, comment: 'why', forMs, atMostMs: 168 * hourMs } as AlarmOrder;
    const answer = await actOnAlarm(b.ledger, alarm?.number ?? 0, order, this.#person());
    return 'refused' in answer ? [`no: ${answer.refused}`] : null;
  }

  async #place(id: Machine, inService: boolean, forMs: number): Promise<string[] | null> {
    const b = this.#bench;
    const place = { machine: b.view.machine(id), point: null };
    const answer = inService
      ? await putInService(b.ledger, place, { newBaseline: false }, this.#person())
      : await takeOutOfService(b.ledger, place, b.clock.wallMs() + forMs, this.#person());
    return 'refused' in answer ? [`no: ${answer.refused}`] : null;
  }

  #person() {
    return { by: 'K. Example', comment: 'why', via: 'command', wallMs: this.#bench.clock.wallMs() } as const;
  }

  /** What the journal got since the line before, with what of it people are told. */
  async #news(): Promise<string[]> {
    const rows = await this.#bench.ledger.read((reader) =>
      readJournal(reader, { afterSequence: this.#sequence, limit: 1000 }),
    );
    this.#sequence = rows.at(-1)?.sequence ?? this.#sequence;
    const told = await this.#bench.ledger.read((reader) =>
      reader.selectFrom('to_tell').select(['journal_sequence', 'severity']).execute(),
    );
    return rows.map((row) => {
      const tell = told.find(({ journal_sequence }) => journal_sequence === row.sequence);
      const moves = row.before === row.after ? '' : `, ${row.before} -> ${row.after}`;
      return `${whereOf(row)}: ${row.event}${moves}${whyOf(row)}${tell === undefined ? '' : `, TELL ${tell.severity}`}`;
    });
  }

  async #standings(): Promise<string[]> {
    return this.#bench.ledger.read(async (reader) => {
      const places = await placesOutOfService(reader);
      const lines: string[] = [];
      for (const alarm of await loadAllAlarms(reader)) {
        const now = standing(alarm.state);
        if (now === 'normal') continue;
        const held = await suppressionNow(reader, alarm, places);
        const until =
          held?.untilMs == null ? '' : ` until ${(held.untilMs - beginMs) / hourMs} h by ${held.by}`;
        const why = held?.while == null ? '' : ` (${held.while})`;
        lines.push(`${nameOf(alarm.key)}: ${now}${until}${why}, ${alarm.state.condition}`);
      }
      return lines.length === 0 ? ['all normal'] : lines;
    });
  }
}

function whereOf({ key, reason }: JournalRow): string {
  return key === null ? String(reason.place) : nameOf(key);
}

function nameOf(key: string): string {
  return key.startsWith('limit:')
    ? (key.split(/[:/]/)[1] ?? key)
    : key.replace('trouble:', '').replace(/:(\w+).*/, ' $1');
}

function whyOf({ reason }: JournalRow): string {
  if (reason.chattering != null) return ' (said to come and go)';
  return typeof reason.while === 'string' ? ` (${reason.while})` : '';
}

function msOf(count: string | undefined, unit: string | undefined): number {
  return Number(count ?? 0) * (unit === 'd' ? 24 : 1) * hourMs;
}
