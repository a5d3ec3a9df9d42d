import {
  printDuration,
  printFrequency,
  printNumber,
  printSeconds,
  printSpeed,
} from '../../config/print-value.ts';
import type { RecordingReach } from '../../signal/recording-reach.ts';
import type { RecordingKind } from '../../signal/segment-length.ts';
import { dbText } from './advice.ts';
import type { NamedBand } from './question.ts';

export type Entry = readonly [title: string, text: string];

/** What a recording can show, line by line; the same of a recording that exists and of one that is planned. */
export function reachEntries(
  recording: RecordingKind,
  reach: RecordingReach,
  about: {
    readonly bands: readonly NamedBand[];
    readonly slowestHz: number | null;
    readonly fastestHz: number | null;
    readonly mounting: string | null;
  },
): Entry[] {
  const { layout } = reach;
  return [
    [
      'lines',
      `one every ${printFrequency(layout.lineSpacingHz)}: segments of ${layout.segmentSamples} samples (${printSeconds(1 / layout.lineSpacingHz)})`,
    ],
    ['averages', averagesText(reach)],
    ['frequencies', frequenciesText(reach, about.mounting)],
    ['two tones', tonesText(recording, reach)],
    ...levelEntries(reach, about.bands),
    ...speedEntries(reach, about),
    ['repetition', repetitionText(reach)],
  ];
}

function averagesText({ layout }: RecordingReach): string {
  const { averages, effectiveAverages, usedPercent } = layout;
  const words = averages === 1 ? 'average' : 'averages';
  return `${averages} ${words}, worth ${printNumber(effectiveAverages)} independent; ${printNumber(usedPercent)} % of the recording used`;
}

function frequenciesText(
  { highestHz, highestBy, lowestIntegratedHz }: RecordingReach,
  mounting: string | null,
) {
  const by = highestBy === 'mounting' ? `a sensor fixed by ${mounting}` : 'sample rate / 2.56';
  const least = printFrequency(lowestIntegratedHz);
  return `up to ${printFrequency(highestHz)} (${by}); bands at least ${least} wide, of velocity from ${least} on`;
}

function tonesText({ window }: RecordingKind, { equalTonesHz, unequalTonesHz }: RecordingReach): string {
  if (equalTonesHz === null || unequalTonesHz === null)
    return `${window} tells none apart for certain: its side lobes hide the weaker one`;
  const weaker =
    unequalTonesHz === equalTonesHz
      ? ', also where one is 20 dB weaker'
      : `, ${printFrequency(unequalTonesHz)} where one is 20 dB weaker`;
  return `told apart from ${printFrequency(equalTonesHz)} on${weaker}`;
}

function levelEntries(reach: RecordingReach, bands: readonly NamedBand[]): Entry[] {
  const { line } = reach;
  if (line === null) return [];
  const of = bands.map(({ name }, n) => `${name}: ${bandText(reach, n)}`);
  return [
    [
      'levels',
      `known in ${printNumber(line.confidencePercent)} of 100 recordings to ${dbText(line)} on a single line of noise; ${of.join('; ')}; steady tones far better`,
    ],
  ];
}

function bandText({ bands, narrowestBandHz }: RecordingReach, n: number): string {
  const { level = null, hindrance = null } = bands[n] ?? {};
  if (level !== null) return dbText(level);
  if (hindrance === 'too-high') return 'not to be had, it ends too high';
  const least = printFrequency(narrowestBandHz);
  return hindrance === 'too-low'
    ? `not to be had below ${least}`
    : `not to be had, it is narrower than ${least}`;
}

function speedEntries(
  { turns, leastNamedHz, layout }: RecordingReach,
  { slowestHz, fastestHz }: { readonly slowestHz: number | null; readonly fastestHz: number | null },
): Entry[] {
  if (slowestHz === null || turns === null) {
    return [['names', `of faults on shafts from ${printSpeed(leastNamedHz)} on (25 lines to the speed)`]];
  }
  const enough = turns < 10 ? ', 10 are the least' : '';
  const named =
    turns >= 25 * (1 - 1e-9)
      ? 'enough to name faults (25)'
      : `too few to name faults (25; from ${printSpeed(leastNamedHz)} on)`;
  const lineHz = layout.lineSpacingHz;
  const entries: Entry[] = [
    [
      'turns',
      `${printNumber(turns)} of the shaft at ${printSpeed(slowestHz)} in a segment${enough}; ${named}`,
    ],
    [
      'speed',
      `may move by ${printSpeed(lineHz, 2)} while one recording lasts before 1x smears over a line, by ${printSpeed(lineHz / 10, 2)} before 10x does`,
    ],
  ];
  if (fastestHz !== null && fastestHz - slowestHz > lineHz) {
    const lines = (fastestHz - slowestHz) / lineHz;
    entries.push([
      '',
      `from ${printSpeed(slowestHz)} to ${printSpeed(fastestHz)} 1x moves over ${printNumber(lines)} lines: hold the speed while recording, give its value or a pulse channel, and state bands in orders`,
    ]);
  }
  return entries;
}

function repetitionText({ slowestRepetitionHz, fastestRepetitionHz }: RecordingReach): string {
  const slow = `once in ${printSeconds(1 / slowestRepetitionHz)} (${printFrequency(slowestRepetitionHz)})`;
  if (fastestRepetitionHz === null)
    return `of impacts, as of a fault: at the slowest ${slow}; no envelope: its band lies out of reach`;
  const fast = `${printDuration(Number((1000 / fastestRepetitionHz).toPrecision(2)))} (${printFrequency(fastestRepetitionHz, 3)})`;
  return `of impacts, as of a fault, from ${slow} to once in ${fast} in an envelope`;
}
