/**
 * `npm run bench`: what the analysis path takes on this machine, in one run. Times here are read by people and
 * compared within the run; no test asserts one.
 */
import { parseArgs } from 'node:util';
import { averagingSpeed } from './averaging-speed.ts';
import { durationS, recordingBytes, sampleRateHz } from './bench-site.ts';
import { type RehearseSpeed, rehearseSpeed } from './rehearse-speed.ts';
import { type StageTimes, stageTimes } from './stages.ts';
import { type ServiceSpeed, throughService } from './through-service.ts';

const { values: options } = parseArgs({
  options: { json: { type: 'boolean', default: false }, recordings: { type: 'string', default: '96' } },
});
const recordings = Number(options.recordings);
if (!Number.isInteger(recordings) || recordings < 1)
  throw new RangeError('--recordings: a whole number is wanted');

const segments = [4096, 16_384];
const differentFiles = 12;

interface Bench {
  readonly averaging: readonly { readonly segmentSamples: number; readonly secondsASecond: number }[];
  readonly stagesMs: StageTimes;
  readonly service: readonly ServiceSpeed[];
  readonly rehearsal: RehearseSpeed;
  readonly mostResidentBytes: number;
}

async function bench(): Promise<Bench> {
  const files = Array.from({ length: differentFiles }, (_, index) => recordingBytes(index));
  const service: ServiceSpeed[] = [];
  for (const threads of [1, 2]) service.push(await throughService(threads, recordings, files));
  service.push(await throughService(1, recordings, files, true));
  const mostResidentBytes = 1024 * process.resourceUsage().maxRSS;
  const stagesMs = await stageTimes(files);
  const averaging = segments.map((segmentSamples) => ({
    segmentSamples,
    secondsASecond: averagingSpeed(segmentSamples),
  }));
  const rehearsal = await rehearseSpeed();
  return { averaging, stagesMs, service, rehearsal, mostResidentBytes };
}

function text({ averaging, stagesMs, service, rehearsal, mostResidentBytes }: Bench): string {
  const [one, two] = service as [ServiceSpeed, ServiceSpeed];
  const whole = stagesMs['whole task of the thread'] as number;
  const wholeCpu = one.cpuMs / one.recordings;
  return [
    'Averaging, Hann, 50 %, 25.6 kHz',
    ...table([
      ['segment', 'seconds of signal a second of CPU'],
      ...averaging.map(({ segmentSamples, secondsASecond }) => [
        `${segmentSamples}`,
        secondsASecond.toFixed(0),
      ]),
    ]),
    '',
    `One recording (${durationS} s, ${sampleRateHz / 1000} kHz, one channel, segment 16384, six bands, peaks), one thread`,
    ...table([
      ['stage', 'ms of CPU', 'of the task'],
      ...Object.entries(stagesMs).map(([stage, ms]) => [stage, ms.toFixed(2), percent(ms / whole)]),
    ]),
    '',
    `The same through the service, ${one.recordings} recordings at once`,
    ...table([
      [
        'threads',
        'recordings a second',
        'a second of CPU',
        'ms of CPU each',
        'decision ms',
        'filing ms',
        'resident MB',
      ],
      ...service.map((run) => [
        `${run.threads}${run.evidence ? ', with envelope and evidence' : ''}`,
        ((1000 * run.recordings) / run.wallMs).toFixed(1),
        ((1000 * run.recordings) / run.cpuMs).toFixed(1),
        (run.cpuMs / run.recordings).toFixed(1),
        run.decisionMs.toFixed(2),
        run.filingMs.toFixed(2),
        megabytes(run.residentBytes),
      ]),
    ]),
    '',
    `Rehearsing ${rehearsal.levels} levels of 12 bands, each with a limit`,
    ...table([
      ['us of CPU a level', 'only reading it', 'ratio', 'a year of 200 points, s'],
      [
        rehearsal.cpuUsALevel.toFixed(2),
        rehearsal.readCpuUsALevel.toFixed(2),
        (rehearsal.cpuUsALevel / rehearsal.readCpuUsALevel).toFixed(1),
        rehearsal.yearOfLargeSiteS.toFixed(0),
      ],
    ]),
    '',
    `Two threads against one: ${(one.wallMs / two.wallMs).toFixed(2)}. CPU through the service against the thread's task: ${(wholeCpu / whole).toFixed(2)}.`,
    `Most resident memory: ${megabytes(mostResidentBytes)} MB. CPU counts all threads, so a second of it is one core busy for a second.`,
    '',
  ].join('\n');
}

/** Columns as wide as their widest text; numbers, in all but the first, to the right. */
function table(rows: readonly (readonly string[])[]): string[] {
  const widths = (rows[0] ?? []).map((_, column) =>
    Math.max(...rows.map((row) => (row[column] ?? '').length)),
  );
  return rows.map((row) =>
    row
      .map((cell, n) => (n === 0 ? cell.padEnd(widths[n] ?? 0) : cell.padStart((widths[n] ?? 0) + 2)))
      .join(''),
  );
}

function percent(share: number): string {
  return `${(100 * share).toFixed(0)} %`;
}

function megabytes(bytes: number): string {
  return (bytes / 1e6).toFixed(0);
}

const result = await bench();
process.stdout.write(options.json ? `${JSON.stringify(result, null, 2)}\n` : text(result));
