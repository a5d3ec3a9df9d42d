import { momentText } from '../../src/advisory/time-words.ts';
import { parseHours } from '../../src/config/hours.ts';
import type { MailSettings, Recipient, Severity } from '../../src/config/site.ts';
import { parseThenAfter } from '../../src/config/then-after.ts';
import { hourMs, MailBench, minuteMs } from '../service/mail-bench.ts';
import { MailServerOnLoopback } from '../service/mail-server.ts';

/**
 * Plays a story of mails line by line, on a real ledger and a real SMTP server, from Tuesday 1 December 2026, 08:00 in Dublin.
 * First what the site file says:
 *   ann [danger|alert|trouble ...] [HOURS]     a recipient
 *   night HOURS                                alerts and troubles are held
 *   remind after TIME [then to NAME after N reminders|TIME]
 *   say again after TIME
 * then what happens:
 *   fan-1 LEVEL | fan-1..fan-12 LEVEL          a recording of a machine, in mm/s
 *   fan-1 overdue | fan-1 sends again
 *   acknowledge NUMBER
 *   server out | server takes mail
 *   wait TIME
 */
export class MailScenario {
  readonly #to: Partial<Recipient>[] = [];
  #mail: Partial<MailSettings> = {};
  #sayAgainAfterMs: number | null = null;
  #begun: { readonly bench: MailBench; readonly server: MailServerOnLoopback } | null = null;
  #seen = 0;

  async play(line: string): Promise<string> {
    const told = this.#setting(line) ? [] : await this.#happen(line);
    return [line, ...told.map((mail) => `    ${mail}`)].join('\n');
  }

  /** Whether the line belongs to the site file. */
  #setting(line: string): boolean {
    const night = /^night (.*)$/.exec(line);
    const remind = /^remind after (\d+ \w+)(?: then to (\w+) after (.*))?$/.exec(line);
    const again = /^say again after (.*)$/.exec(line);
    const recipient = /^(ann|ben|cat)((?: (?:danger|alert|trouble))*)(?: (.*))?$/.exec(line);
    if (night !== null) this.#mail = { ...this.#mail, holdDuring: hours(night[1] ?? '') };
    else if (remind !== null) {
      const after = parseThenAfter(remind[3] ?? '2 reminders');
      if (!after.ok) throw new Error(after.what);
      const reminders = {
        afterMs: time(remind[1] ?? ''),
        thenTo: remind[2] === undefined ? [] : [addressOf(remind[2])],
        thenAfter: after.value,
      };
      this.#mail = { ...this.#mail, reminders };
    } else if (again !== null) this.#sayAgainAfterMs = time(again[1] ?? '');
    else if (recipient !== null) {
      const [, name = '', severities = '', when] = recipient;
      this.#to.push({
        address: addressOf(name),
        severities: severities === '' ? null : (severities.trim().split(' ') as Severity[]),
        ...(when === undefined ? {} : { hours: hours(when) }),
      });
    } else return false;
    if (this.#begun !== null) throw new Error(`too late for: ${line}`);
    return true;
  }

  async #begin() {
    if (this.#begun !== null) return this.#begun;
    const server = await MailServerOnLoopback.start();
    const fans = Array.from({ length: 20 }, (_, index) => [`fan-${index + 1}`, { de: ['overall'] }]);
    const bench = await MailBench.start({
      tree: Object.fromEntries(fans),
      port: server.port,
      to: this.#to,
      mail: this.#mail,
      limit: { sayAgainAfterMs: this.#sayAgainAfterMs },
    });
    this.#begun = { bench, server };
    return this.#begun;
  }

  async #happen(line: string): Promise<string[]> {
    const { bench, server } = await this.#begin();
    const recording = /^fan-(\d+)(?:\.\.fan-(\d+))? ([\d.]+)$/.exec(line);
    const silence = /^(fan-\d+) (overdue|sends again)$/.exec(line);
    const acknowledged = /^acknowledge (\d+)$/.exec(line);
    const wait = /^wait (.*)$/.exec(line);
    if (recording !== null) {
      const [first, last, level] = [recording[1], recording[2] ?? recording[1], recording[3]].map(Number);
      for (let fan = first as number; fan <= (last as number); fan++)
        await bench.record(`fan-${fan}/de`, { overall: level as number });
    } else if (silence !== null)
      await bench.look('overdue', silence[2] === 'overdue', { machineId: silence[1] ?? '', pointId: 'de' });
    else if (acknowledged !== null) await bench.command(Number(acknowledged[1]), 'acknowledge');
    else if (line === 'server out') server.atRecipient = () => 421;
    else if (line === 'server takes mail') server.atRecipient = () => undefined;
    else if (wait !== null) return this.#wait(time(wait[1] ?? ''));
    else throw new Error(`no such line in a scenario: ${line}`);
    return [];
  }

  /** As the service does: a round, and the next when it says so, or when a command may have come. */
  async #wait(ms: number): Promise<string[]> {
    const { bench, server } = await this.#begin();
    const told: string[] = [];
    const stepMs = ms > 24 * hourMs ? hourMs : 10 * minuteMs;
    const endMs = bench.clock.wallMs() + ms;
    for (;;) {
      const round = await bench.rounds.round();
      const at = momentText(bench.clock.wallMs(), 'Europe/Dublin').replace(/ Dec 2026,/, '');
      const now: string[] = [];
      for (const { recipient, mail } of server.got.slice(this.#seen)) {
        const words = mail.text?.replace(/\s+/g, ' ') ?? '';
        const reminder = /Reminder \d+/.exec(words)?.[0];
        const again = /Told again: .*? acknowledged it/.test(words) ? 'told again' : undefined;
        const remark = reminder ?? again;
        const shown = mail.subject?.replace(' mm/s r.m.s.', '').replace('Larkfen Waterworks: ', '');
        now.push(`${at}  ${recipient.split('@')[0]}: ${shown}${remark ? ` [${remark.toLowerCase()}]` : ''}`);
      }
      this.#seen = server.got.length;
      told.push(...now.sort());
      const left = endMs - bench.clock.wallMs();
      if (left <= 0) return told;
      bench.clock.advance(Math.min(left, Math.max(round.againInMs ?? stepMs, 1_000), stepMs));
    }
  }
}

function addressOf(name: string): string {
  return `${name}@larkfen.example`;
}

function hours(text: string) {
  const parsed = parseHours(text);
  if (!parsed.ok) throw new Error(parsed.what);
  return parsed.value;
}

function time(text: string): number {
  const [count = 0, unit = ''] = text.split(' ');
  const size = { s: 1000, min: minuteMs, h: hourMs, d: 24 * hourMs }[unit];
  if (size === undefined) throw new Error(`no such time: ${text}`);
  return Number(count) * size;
}
