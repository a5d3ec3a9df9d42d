import { resolve } from 'node:path';
import { printableName } from '../../acquisition/file-name.ts';
import { nothingSaid } from '../../config/sample-layout.ts';
import { pointPath } from '../../config/site.ts';
import { analyseFile } from '../../service/analyse-file.ts';
import { readSiteFile } from '../../service/site-in-force.ts';
import { overlapGain } from '../../signal/overlap-gain.ts';
import { planRecording } from '../../signal/recording-plan.ts';
import { recordingReach } from '../../signal/recording-reach.ts';
import type { RecordingKind } from '../../signal/segment-length.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused } from '../open.ts';
import { writeJson } from '../output.ts';
import { adviceOn } from '../recording-plan/advice.ts';
import { answersTo } from '../recording-plan/answers.ts';
import { type AskedPlan, type PlanOptions, readPlanOptions } from '../recording-plan/options.ts';
import { planJson, reachedJson } from '../recording-plan/plan-json.ts';
import { planText, type Reached, reachText } from '../recording-plan/plan-text.ts';
import {
  confidenceOf,
  type PlanQuestion,
  questionOf,
  reachQuestion,
  recordingOf,
  shownBands,
  wishOf,
} from '../recording-plan/question.ts';
import { findPoint } from '../site-names.ts';

interface Options extends PlanOptions {
  readonly site: string;
  readonly point?: string;
  readonly json?: boolean;
}

/** `recording-plan`: the recordings that a wish needs, or what recordings as they are can and cannot show. */
export const addRecordingPlan: AddCommand = (program, io, done) => {
  program
    .command('recording-plan')
    .description('how to record for what is to be seen, or what a recording can and cannot show')
    .option('--line-spacing <hz>', "widest distance of lines, such as '1 Hz'")
    .option('--separate <f1..f2...>', "two frequencies to be told apart, such as '49.5 Hz..50 Hz'")
    .option('--confidence <db>', "how well levels are to be known, such as '1 dB' or '1 dB at 90 %'")
    .option(
      '--band <from..to[:quantity]>',
      'the confidence is of its level; may be given several times',
      collect,
    )
    .option('--speed <rpm..rpm>', "of the slowest shaft, such as '1480 rpm' or '900 rpm..1500 rpm'")
    .option('--highest <hz>', "highest frequency to be seen, such as '10 kHz'")
    .option('--mounting <how>', 'of the sensor: stud, glue, magnet or hand')
    .option('--window <name>', 'hann (default), rectangular, hamming, blackman, blackman-harris, flat-top')
    .option('--overlap <percent>', '0 to 95 (default: what suits the window)')
    .option('--recording <file>', 'the other way round: what this recording can show')
    .option('--duration <time>', "or a recording of this length, such as '10 s'")
    .option('--sample-rate <hz>', "of the recording or the logger, such as '25.6 kHz'")
    .option('--segment <samples>', 'of the recording as it is, a power of two')
    .option('--point <machine/point>', 'takes the settings of a point of the site file')
    .option('--site <file>', 'site file of --point', './site.yaml')
    .option('--json', 'as JSON')
    .addHelpText(
      'after',
      "\nExamples:\n  humledger recording-plan --separate '49.5 Hz..50 Hz' --confidence '1 dB' --speed '900 rpm..1500 rpm'\n  humledger recording-plan --sample-rate '25.6 kHz' --duration '10 s'\n  humledger recording-plan --point blower-1/de-h",
    )
    .action(async (options: Options) => done(await run(options, io)));
};

function collect(value: string, before: readonly string[] = []): readonly string[] {
  return [...before, value];
}

async function run(options: Options, io: CommandIo): Promise<ExitStatus> {
  const asked = readPlanOptions(options);
  if ('wrong' in asked) return misused(io, asked.wrong);
  const at =
    options.point === undefined ? null : atPoint(options.point, resolve(io.workingFolder, options.site));
  if (at !== null && 'problems' in at) return misused(io, at.problems.join('\n'));
  const question = questionOf(asked, at);
  if ('wrong' in question) return misused(io, question.wrong);
  if (asked.recording !== null || asked.durationS !== null) return asItIs(question, options, io);
  if (wishesSomething(asked)) return planned(question, options, io);
  if (at !== null) return asItIs(question, options, io);
  return misused(
    io,
    'say what is to be seen (--line-spacing, --separate, --confidence, --speed, --highest), or which recording to judge (--recording, or --sample-rate and --duration, or --point)',
  );
}

function wishesSomething({
  lineSpacingHz,
  separate,
  confidence,
  highestHz,
  bands,
  speed,
}: AskedPlan): boolean {
  return (
    [lineSpacingHz, separate, confidence, highestHz, speed].some((wish) => wish !== null) || bands.length > 0
  );
}

function atPoint(
  path: string,
  sitePath: string,
): PlanQuestion['at'] | { readonly problems: readonly string[] } {
  const siteFile = readSiteFile(sitePath);
  if ('problems' in siteFile) return siteFile;
  const found = findPoint(siteFile.site, path);
  return 'unknown' in found ? { problems: [found.unknown] } : found;
}

function planned(question: PlanQuestion, options: Options, io: CommandIo): ExitStatus {
  const plan = planRecording(wishOf(question));
  if ('refused' in plan) return fail(io, plan.reason);
  const reach = recordingReach(plan.recording, reachQuestion(question, plan.recording.sampleRateHz));
  const overlaps = overlapGain(plan.recording, confidenceOf(question));
  const all = { question, plan, reach, overlaps };
  if (options.json === true) writeJson(io.out, planJson(all));
  else io.out.write(planText(all));
  return 0;
}

async function asItIs(question: PlanQuestion, options: Options, io: CommandIo): Promise<ExitStatus> {
  const found = await lengthOf(question, io);
  if ('reason' in found) return fail(io, found.reason);
  const recording: RecordingKind = recordingOf(question, found);
  const reach = recordingReach(recording, reachQuestion(question, recording.sampleRateHz));
  const reached: Reached = {
    question,
    about: found.about,
    recording,
    reach,
    overlaps: overlapGain(recording, confidenceOf(question)),
    advice: adviceOn(recording, reach, { ...question, bands: shownBands(question), named: true }),
    answers: reach.layout.averages === 0 ? [] : answersTo(question, recording, reach),
  };
  if (options.json === true) writeJson(io.out, reachedJson(reached));
  else io.out.write(reachText(reached));
  return 0;
}

interface Length {
  readonly about: string;
  readonly sampleRateHz: number;
  readonly durationS: number;
}

async function lengthOf(
  question: PlanQuestion,
  io: CommandIo,
): Promise<Length | { readonly reason: string }> {
  const { asked, at } = question;
  const rateHz = asked.sampleRateHz ?? at?.point.recordings.sampleRateHz ?? null;
  if (asked.recording !== null) return lengthOfFile(asked.recording, question, rateHz, io);
  const durationS = asked.durationS ?? at?.point.recordings.durationS ?? null;
  if (durationS === null)
    return {
      reason: 'the site file does not say how long its recordings are: add --duration or --recording',
    };
  if (rateHz === null) return { reason: 'nothing says the sample rate: add --sample-rate' };
  const about = at === null ? 'Recordings' : `Recordings of ${pointPath(at.point)}`;
  return { about, sampleRateHz: rateHz, durationS };
}

/** Largest file whose length is looked up. */
const largestBytes = 4e9;

async function lengthOfFile(
  file: string,
  { at }: PlanQuestion,
  rateHz: number | null,
  io: CommandIo,
): Promise<Length | { readonly reason: string }> {
  const name = printableName(file);
  const read = await analyseFile(resolve(io.workingFolder, file), largestBytes, {
    layout: at?.point.recordings.layout ?? nothingSaid,
    planFor: (_, sidecar) => ({
      points: [],
      sidecar,
      clock: { kind: 'utc' },
      siteZone: 'UTC',
      startInName: null,
    }),
  });
  if ('reason' in read) return { reason: `${name}: ${read.reason}` };
  const sampleRateHz = read.sampleRateHz ?? rateHz;
  if (sampleRateHz === null) return { reason: `${name} does not say its sample rate: add --sample-rate` };
  return { about: name, sampleRateHz, durationS: read.frames / sampleRateHz };
}
