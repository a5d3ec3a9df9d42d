import { existsSync, mkdirSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join, relative, resolve } from 'node:path';
import { commandAlarm } from '../../service/alarm-command.ts';
import { SteppedClock } from '../../service/clock.ts';
import { noLog } from '../../service/log.ts';
import { summaryNow } from '../../service/morning.ts';
import { Service } from '../../service/service.ts';
import { readSiteFile } from '../../service/site-in-force.ts';
import { standingAlarms } from '../../store/alarms.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { catchMails, type MailCatcher } from '../demo/mail-catcher.ts';
import { days } from '../demo/scenario.ts';
import { beginMs, type PersonsPart, timeLapse } from '../demo/time-lapse.ts';

/** `demo`: the invented site, from generated recordings to summary and mails, in a folder of its own. */
export const addDemo: AddCommand = (program, io, done) => {
  program
    .command('demo')
    .description('the demo site in time-lapse, from generated recordings to summary and mails')
    .option('--folder <folder>', 'folder of its own; made new', './humledger-demo')
    .option('--days <days>', `days of the story, 1 to ${days}`, String(days))
    .addHelpText('after', '\nExample:\n  humledger demo --folder /tmp/larkfen')
    .action(async (options: { folder: string; days: string }) => {
      const storyDays = Number(options.days);
      if (!Number.isInteger(storyDays) || storyDays < 1 || storyDays > days) {
        io.err.write(`--days ${options.days}: a whole number from 1 to ${days} is wanted\n`);
        done(2);
        return;
      }
      done(await demo(resolve(io.workingFolder, options.folder), storyDays, io));
    });
};

const marker = '.made-by-humledger-demo';

async function demo(folder: string, storyDays: number, io: CommandIo): Promise<ExitStatus> {
  if (!makeFolder(folder)) {
    io.err.write(`${folder} exists and was not made by the demo; name another with --folder\n`);
    return 1;
  }
  const clock = new SteppedClock(beginMs);
  const catcher = await catchMails(join(folder, 'mails'), () => clock.wallMs());
  try {
    return await tell(folder, storyDays, clock, catcher, io);
  } finally {
    await catcher.close();
  }
}

async function tell(
  folder: string,
  storyDays: number,
  clock: SteppedClock,
  catcher: MailCatcher,
  io: CommandIo,
): Promise<ExitStatus> {
  const path = join(folder, 'site.yaml');
  const template = readFileSync(new URL('../../../demo-data/site.yaml', import.meta.url), 'utf8');
  writeFileSync(path, template.replace('port: 2525', `port: ${catcher.port}`));
  const siteFile = readSiteFile(path);
  if ('problems' in siteFile) {
    io.err.write(`${siteFile.problems.join('\n')}\n`);
    return 2;
  }
  const service = await Service.start({ siteFile, clock, log: noLog });
  if ('refused' in service) {
    io.err.write(`${service.refused}\n`);
    return 1;
  }
  const { drop } = siteFile.site.folders;
  try {
    await timeLapse(service, clock, drop, parts, progress(io, storyDays, catcher), storyDays);
    io.out.write(`${await lastSummary(service, clock.wallMs())}`);
  } finally {
    await service.stop();
  }
  show(folder, storyDays, catcher, io);
  return 0;
}

/** False where the folder is somebody else's. An earlier demo makes room. */
function makeFolder(folder: string): boolean {
  if (existsSync(folder)) {
    if (readdirSync(folder).length > 0 && !existsSync(join(folder, marker))) return false;
    rmSync(folder, { recursive: true });
  }
  mkdirSync(join(folder, 'drop'), { recursive: true });
  writeFileSync(join(folder, marker), '');
  return true;
}

function progress(io: CommandIo, storyDays: number, catcher: MailCatcher): (day: number) => void {
  const terminal = 'isTTY' in io.err && io.err.isTTY === true;
  return (day) => {
    const text = `day ${day} of ${storyDays}, ${catcher.mails.length} mails`;
    if (terminal) io.err.write(`\r${text}${day === storyDays ? '\n' : ''}`);
    else if (day % 15 === 0 || day === storyDays) io.err.write(`${text}\n`);
  };
}

/** What the people of the site do in the story. */
const parts: readonly PersonsPart[] = [
  {
    day: 8,
    act: (service, nowMs) => acknowledgeAll(service, nowMs, 'M. Reilly', 'logger of the fan restarted'),
  },
  {
    day: 35,
    act: (service, nowMs) => acknowledgeAll(service, nowMs, 'M. Reilly', 'work order written'),
  },
];

async function acknowledgeAll(service: Service, wallMs: number, by: string, comment: string): Promise<void> {
  await service.ledger.transact(async (writer) => {
    for (const { life } of await standingAlarms(writer)) {
      await commandAlarm(
        writer,
        life.number,
        { kind: 'acknowledge', comment },
        { by, via: 'command', wallMs },
      );
    }
  });
}

/** The story ends with a morning, so what the summary says now is the last one that was sent. */
async function lastSummary(service: Service, nowMs: number): Promise<string> {
  const { ledger, view, startedMs } = service;
  return (await summaryNow({ ledger, view, nowMs, upSinceMs: startedMs })).mail.text;
}

/** Days of the story that the suggested trend reaches back. */
const lastDays = 6;

function show(folder: string, storyDays: number, catcher: MailCatcher, io: CommandIo): void {
  const here = (path: string) => relative(io.workingFolder, join(folder, path)) || '.';
  const summaries = existsSync(join(folder, 'data/summary'))
    ? readdirSync(join(folder, 'data/summary')).filter((name) => /^\d/.test(name))
    : [];
  const told = catcher.mails.filter((name) => !name.includes('_summary_'));
  io.out.write(`\n${'-'.repeat(72)}\n`);
  io.out.write(
    `Mails:      ${here('mails')}/, ${catcher.mails.length} files; alarms, troubles and the service among them:\n`,
  );
  for (const name of told) io.out.write(`              ${name}\n`);
  io.out.write(
    `Summaries:  ${here('data/summary')}/, ${summaries.length} mornings; the last one is latest.html\n`,
  );
  io.out.write(`Ledger:     ${here('data/ledger.sqlite')}\n`);
  io.out.write(`Site file:  ${here('site.yaml')}\n\n`);
  // `npm run demo` from a checkout: there is no `humledger` on the path yet.
  const program = process.env.npm_lifecycle_event === 'demo' ? 'npm run -s humledger --' : 'humledger';
  io.out.write(`Look further, for example:\n`);
  io.out.write(`  ${program} alarms --site ${here('site.yaml')}\n`);
  const since = new Date(beginMs + Math.max(0, storyDays - lastDays) * 86_400_000).toISOString().slice(0, 10);
  io.out.write(`  ${program} trend pump-2/de-v overall --since ${since} --site ${here('site.yaml')}\n`);
}
