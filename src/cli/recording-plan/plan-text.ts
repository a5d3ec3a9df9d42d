import { plain } from '../../advisory/escape.ts';
import { printFrequency, printNumber, printSeconds } from '../../config/print-value.ts';
import { pointPath } from '../../config/site.ts';
import type { OverlapRow } from '../../signal/overlap-gain.ts';
import { handyLength, type RecordingPlan, type SpacingReason } from '../../signal/recording-plan.ts';
import type { RecordingReach } from '../../signal/recording-reach.ts';
import type { RecordingKind } from '../../signal/segment-length.ts';
import { lineWidth, listing, table, wrapText } from '../output.ts';
import { type Advice, dbText, lengthText } from './advice.ts';
import { type PlanQuestion, shownBands } from './question.ts';
import { type Entry, reachEntries } from './reach-text.ts';

export interface Planned {
  readonly question: PlanQuestion;
  readonly plan: RecordingPlan;
  readonly reach: RecordingReach;
  readonly overlaps: readonly OverlapRow[];
}

/** First the lines for the site file, then why they do it. */
export function planText({ question, plan, reach, overlaps }: Planned): string {
  const { at } = question;
  const where = at === null ? 'Set in the site file' : `Set for ${pointPath(at.point)} in the site file`;
  const why: Entry[] = [
    ['asked', askedText(question, plan)],
    ...reachEntries(plan.recording, reach, { ...question, bands: shownBands(question) }),
    ...pooledEntry(plan),
  ];
  return [
    `${where}\n\n${siteLines(plan.recording)}`,
    `Why\n${listing(why, '  ')}`,
    overlapText(plan.recording, overlaps),
  ].join('\n');
}

/** Recordings of a minute and more are long for a logger; a segment each, pooled, gives the averages too. */
function pooledEntry({ recording, layout }: RecordingPlan): Entry[] {
  if (recording.durationS < 60) return [];
  const least = handyLength(recording.skipStartS + recording.segmentSamples / recording.sampleRateHz);
  const many = Math.ceil(layout.effectiveAverages);
  return [
    [
      'shorter',
      `recordings of ${printSeconds(least)} hold one segment; average_over: ${many} recordings, under analysis, pools as many averages from them`,
    ],
  ];
}

/** Ready to paste; loaded, they mean the plan again. */
export function siteLines({
  sampleRateHz,
  durationS,
  window,
  overlapPercent,
  segmentSamples,
}: RecordingKind) {
  return [
    'recordings:',
    `  sample_rate: ${printFrequency(sampleRateHz, 9)}`,
    `  duration: ${lengthText(durationS)}`,
    'analysis:',
    `  window: ${window}`,
    `  overlap: ${printNumber(overlapPercent, 6)} %`,
    `  line_spacing: ${spacingText(sampleRateHz / segmentSamples)} Hz`,
    '',
  ].join('\n');
}

/** Few figures, rounded up: a narrower spacing would ask for the next longer segment. */
function spacingText(lineSpacingHz: number): string {
  const step = 10 ** (2 - Math.floor(Math.log10(lineSpacingHz)));
  return printNumber(Math.ceil(lineSpacingHz * step - 1e-9) / step, 4);
}

const reasons: Readonly<Record<SpacingReason, string>> = {
  asked: 'asked for',
  separate: 'for the two tones',
  band: 'for the narrowest or lowest band',
  names: 'to name faults at the slowest shaft',
  usual: 'usual; nothing finer is asked for',
};

function askedText({ asked, bands }: PlanQuestion, plan: RecordingPlan): string {
  const { confidence, separate } = asked;
  const spacing = `a line every ${printFrequency(plan.widestSpacingHz)} or less (${reasons[plan.spacingFor]})`;
  const apart =
    separate === null
      ? []
      : [
          `${printFrequency(separate.lowHz)} and ${printFrequency(separate.highHz)} told apart, one up to 20 dB weaker`,
        ];
  const of = bands.length > 0 ? 'the levels of the bands' : 'a single line';
  const level =
    confidence === null
      ? '16 independent averages (usual for single lines)'
      : `${of} within ${printNumber(confidence.db)} dB in ${printNumber(confidence.percent)} of 100 recordings`;
  return [...apart, spacing, level].join('; ');
}

/** What more overlap would still buy; null-sized where nothing fits. */
export function overlapText(recording: RecordingKind, rows: readonly OverlapRow[]): string {
  const own = rows.find(({ overlapPercent }) => overlapPercent === recording.overlapPercent);
  if (own === undefined) return '';
  const best = rows.find(({ shareOfMostPercent }) => shareOfMostPercent >= 98) ?? own;
  const gain = 100 * (best.effectiveAverages / own.effectiveAverages - 1);
  const repeats = rows.find((row) => row.repeats && row.overlapPercent > own.overlapPercent);
  const says =
    gain < 2
      ? 'More overlap than this buys nothing'
      : `More overlap buys ${printNumber(gain, 2)} % more averages (${printNumber(best.overlapPercent)} %)`;
  const from =
    repeats === undefined ? '' : `; from ${printNumber(repeats.overlapPercent)} % on it only repeats data`;
  const body = table(
    [
      { title: 'overlap', right: true },
      { title: 'averages', right: true },
      { title: 'worth', right: true },
      { title: 'a line of noise to' },
      { title: 'of the most', right: true },
      { title: '' },
    ],
    rows.map((row) => [
      `${printNumber(row.overlapPercent)} %`,
      String(row.averages),
      printNumber(row.effectiveAverages),
      dbText(row.line),
      `${printNumber(row.shareOfMostPercent)} %`,
      row === own ? '<- as set' : row.repeats ? 'repeats data' : '',
    ]),
    lineWidth - 2,
  );
  return `${wrapText(`${says}${from}`, lineWidth).join('\n')}\n${body.replace(/^(?=.)/gm, '  ')}`;
}

export interface Reached {
  readonly question: PlanQuestion;
  /** What it is about: a file, a point, or nothing but numbers. */
  readonly about: string;
  readonly recording: RecordingKind;
  readonly reach: RecordingReach;
  readonly overlaps: readonly OverlapRow[];
  readonly advice: readonly Advice[];
  readonly answers: readonly WishAnswer[];
}

/** Whether the recording does what was asked of it, and what would. */
export interface WishAnswer {
  readonly asked: string;
  readonly met: boolean;
  readonly remedy: string | null;
}

/** What a recording can show, what it cannot, and what would. */
export function reachText({ question, about, recording, reach, overlaps, advice, answers }: Reached): string {
  const { sampleRateHz, durationS, window, overlapPercent } = recording;
  const head = `${about}: ${printSeconds(durationS)} at ${printFrequency(sampleRateHz, 6)}, ${window}, overlap ${printNumber(overlapPercent)} %`;
  const lines = [wrapText(plain(head), lineWidth).join('\n')];
  if (reach.layout.averages === 0) {
    const seconds = recording.segmentSamples / sampleRateHz;
    lines.push(
      `\nNot one segment of ${recording.segmentSamples} samples (${printNumber(seconds)} s) fits: no level, no spectrum.`,
    );
    return `${lines.join('\n')}\n`;
  }
  const parts = [
    `${lines.join('\n')}\n`,
    ...(answers.length === 0 ? [] : [`Asked\n${answers.map(answerText).join('')}`]),
    `Can show\n${listing(reachEntries(recording, reach, { ...question, bands: shownBands(question) }), '  ')}`,
    ...(advice.length === 0 ? [] : [`Cannot show\n${advice.map(adviceText).join('')}`]),
    overlapText(recording, overlaps),
  ];
  return parts.join('\n');
}

function answerText({ asked, met, remedy }: WishAnswer): string {
  return bullet(`${asked}: ${met ? 'yes' : 'no'}${remedy === null ? '' : `; ${remedy}`}`);
}

function adviceText({ what, remedy }: Advice): string {
  return bullet(`${what}; ${remedy}`);
}

function bullet(text: string): string {
  return wrapText(plain(text), lineWidth - 4)
    .map((part, n) => `  ${n === 0 ? '-' : ' '} ${part}\n`)
    .join('');
}
