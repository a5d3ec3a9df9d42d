import type { Command } from 'commander';
import type { Site } from '../../config/site.ts';
import type { Place } from '../../service/machine-acts.ts';
import {
  type Commented,
  putInService,
  type ServiceAnswer,
  takeOutOfService,
} from '../../service/place-service.ts';
import type { Ledger } from '../../store/ledger.ts';
import type { CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { ownText, textsProblem } from '../person.ts';
import { findPlace } from '../site-names.ts';
import { parseUntil, timeText } from '../when.ts';

/** `alarms out-of-service` and `alarms in-service`: a machine or a point with everything that belongs to it. */
interface PlaceOptions {
  readonly site: string;
  readonly by: string;
  readonly comment: string;
}

const longestMs = 366 * 86_400_000;

export function addServiceCommands(alarms: Command, io: CommandIo, done: (status: ExitStatus) => void): void {
  const place = (name: string, description: string, example: string) =>
    alarms
      .command(name)
      .description(description)
      .argument('<machine[/point]>', 'machine with all its points, or one of them')
      .requiredOption('--by <name>', 'who orders it')
      .requiredOption('--comment <text>', 'why')
      .option('--site <file>', 'site file')
      .addHelpText('after', `\nExample:\n  humledger alarms ${name} ${example}`);
  place(
    'out-of-service',
    'holds back all alarms and troubles of a machine or point, for maintenance; ends by itself',
    "pump-2 --until '2026-03-04 14:00' --by 'A. Fitter' --comment 'seal replaced'",
  )
    .requiredOption('--until <when>', "a date or time of the site's clock, or from now: '3 d'")
    .action(async (path: string, options: PlaceOptions & { readonly until: string }, self: Command) => {
      const { site } = self.optsWithGlobals<{ site: string }>();
      done(await outOfService(path, { ...options, site }, io));
    });
  place(
    'in-service',
    'ends it before its time; what stands is told',
    "pump-2 --new-baseline --by 'A. Fitter' --comment 'runs again with a new seal'",
  )
    .option('--new-baseline', 'what is usual is learned anew from now on, as after an overhaul')
    .action(
      async (path: string, options: PlaceOptions & { readonly newBaseline?: boolean }, self: Command) => {
        const { site } = self.optsWithGlobals<{ site: string }>();
        done(await inService(path, { ...options, site }, io));
      },
    );
}

function outOfService(
  path: string,
  options: PlaceOptions & { readonly until: string },
  io: CommandIo,
): Promise<ExitStatus> {
  return withPlace(path, options, io, (site, place, person) => {
    const until = parseUntil(options.until, person.wallMs, site.timeZone);
    if (!until.ok) return { wrong: `--until: ${until.what}` };
    if (until.value - person.wallMs > longestMs) return { wrong: '--until: more than a year from now' };
    const untilMs = Math.round(until.value);
    return {
      run: (ledger) => takeOutOfService(ledger, place, untilMs, person),
      words: ({ alarms }) =>
        `${path}: out of service until ${timeText(untilMs, site.timeZone)}${standing(alarms, 'held back')}`,
    };
  });
}

function inService(
  path: string,
  options: PlaceOptions & { readonly newBaseline?: boolean },
  io: CommandIo,
): Promise<ExitStatus> {
  const newBaseline = options.newBaseline === true;
  return withPlace(path, options, io, (_, place, person) => ({
    run: (ledger) => putInService(ledger, place, { newBaseline }, person),
    words: ({ alarms, baselines, staying }) => {
      const learned = newBaseline
        ? `; ${baselines === 0 ? 'there is no baseline yet' : baselines === 1 ? '1 baseline is learned anew' : `${baselines} baselines are learned anew`}`
        : '';
      const rest = staying.length === 0 ? '' : `; still out of service: ${staying.join(', ')}`;
      return `${path}: in service${standing(alarms, 'no longer held back')}${learned}${rest}`;
    },
  }));
}

interface Order {
  readonly run: (ledger: Ledger) => Promise<ServiceAnswer | { readonly refused: string }>;
  readonly words: (answer: ServiceAnswer) => string;
}

function withPlace(
  path: string,
  options: PlaceOptions,
  io: CommandIo,
  orderOf: (site: Site, place: Place, person: Commented) => Order | { readonly wrong: string },
): Promise<ExitStatus> {
  const [by, comment] = [ownText(options.by) ?? '', ownText(options.comment) ?? ''];
  const wrong = textsProblem({ by, comment });
  if (wrong !== null) return Promise.resolve(misused(io, wrong));
  return withSite(io, options.site, ({ site }) => {
    const place = findPlace(site, path);
    if ('unknown' in place) return Promise.resolve(fail(io, place.unknown));
    const order = orderOf(site, place, { by, comment, via: 'command', wallMs: wallMs(io) });
    if ('wrong' in order) return Promise.resolve(misused(io, order.wrong));
    return withLedger(io, site, 'guest', async (ledger) => {
      const answer = await order.run(ledger);
      if ('refused' in answer) return fail(io, answer.refused);
      if (answer.note !== null) io.err.write(`note: ${answer.note}\n`);
      io.out.write(`${order.words(answer)}\n`);
      return 0;
    });
  });
}

function standing(count: number, what: string): string {
  if (count === 0) return '';
  return `; ${count} standing ${count === 1 ? 'alarm' : 'alarms'} ${what}`;
}
