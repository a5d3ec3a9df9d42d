import { parseSampleUnit, parseSampleValue } from '../../config/level.ts';
import { longestSegmentSamples } from '../../config/meaning.ts';
import { nearest } from '../../config/nearest.ts';
import { type Parsed, parseFrequency, refused, understood } from '../../config/quantity.ts';
import { parseDatasetPath, type SampleLayout } from '../../config/sample-layout.ts';
import { parseSensitivity, type Sensitivity } from '../../config/sensitivity.ts';
import type { Band, Quantity, SampleUnit, WindowName } from '../../config/site.ts';
import { usualDisplayUnit } from '../../config/units.ts';
import { integrationsBetween } from '../../signal/integration.ts';
import { windowNames } from '../../signal/window.ts';

/** As commander hands them over; what was not given is undefined. */
export interface OneOffOptions {
  readonly samplesIn?: string;
  readonly fullScale?: string;
  readonly sensitivity?: string;
  readonly sampleRate?: string;
  readonly dataset?: string;
  readonly sampleRateAttribute?: string;
  readonly channelsIn?: string;
  readonly window?: string;
  readonly overlap?: string;
  readonly segment?: string;
  readonly band?: readonly string[];
}

/** The settings of an analysis without a site file; null: not said, the file may say it. */
export interface OneOffSettings {
  readonly samplesIn: SampleUnit | null;
  /** In the unit of `samplesIn`. */
  readonly fullScale: number | null;
  readonly sensitivity: (Sensitivity & { readonly text: string }) | null;
  readonly sampleRateHz: number | null;
  readonly layout: SampleLayout;
  readonly window: WindowName;
  readonly overlapPercent: number;
  readonly segmentSamples: number | null;
  readonly bands: readonly AskedBand[];
}

export interface AskedBand {
  /** As written. */
  readonly id: string;
  readonly fromHz: number;
  readonly toHz: number;
  /** Null: the channel's own. */
  readonly quantity: Quantity | null;
}

const optionNames = {
  samplesIn: '--samples-in',
  fullScale: '--full-scale',
  sensitivity: '--sensitivity',
  sampleRate: '--sample-rate',
  dataset: '--dataset',
  sampleRateAttribute: '--sample-rate-attribute',
  channelsIn: '--channels-in',
  window: '--window',
  overlap: '--overlap',
  segment: '--segment',
  band: '--band',
} as const satisfies Record<keyof OneOffOptions, string>;

/** Names of the options that were given and that only an analysis without a site file takes. */
export function oneOffOptionsGiven(options: OneOffOptions): string[] {
  return (Object.keys(optionNames) as (keyof OneOffOptions)[])
    .filter((key) => options[key] !== undefined)
    .map((key) => optionNames[key]);
}

/** Every option read, or the first that is wrong, in one line. */
export function readOneOffOptions(options: OneOffOptions): OneOffSettings | { readonly wrong: string } {
  const problems: string[] = [];
  const read = <T>(key: keyof OneOffOptions, parse: (text: string) => Parsed<T>): T | null => {
    const written = options[key] as string | undefined;
    if (written === undefined) return null;
    const parsed = parse(written);
    if (parsed.ok) return parsed.value;
    const instead = parsed.instead === null ? '' : `; write: ${optionNames[key]} '${parsed.instead}'`;
    problems.push(`${optionNames[key]}: ${parsed.what}${instead}`);
    return null;
  };
  const samplesIn = read('samplesIn', parseSampleUnit);
  const settings: OneOffSettings = {
    samplesIn,
    fullScale: read('fullScale', (text) => fullScale(text, samplesIn)),
    sensitivity: read('sensitivity', (text) => {
      const parsed = parseSensitivity(text);
      return parsed.ok ? understood({ ...parsed.value, text }) : parsed;
    }),
    sampleRateHz: read('sampleRate', frequency),
    layout: {
      dataset: read('dataset', parseDatasetPath),
      sampleRateAttribute: read('sampleRateAttribute', understood),
      channelsIn: read('channelsIn', side),
    },
    window: read('window', windowName) ?? 'hann',
    overlapPercent: read('overlap', overlap) ?? 50,
    segmentSamples: read('segment', segment),
    bands: (options.band ?? []).flatMap((text) => {
      const parsed = askedBand(text);
      if (!parsed.ok) problems.push(`--band ${text}: ${parsed.what}`);
      return parsed.ok ? [parsed.value] : [];
    }),
  };
  if (problems.length === 0) problems.push(...disagreements(settings));
  return problems[0] === undefined ? settings : { wrong: problems[0] };
}

/** The quantity that a channel measures where the options say what its samples are; null where they do not. */
export function quantityOf({ samplesIn, sensitivity }: OneOffSettings): Quantity | null {
  return sensitivity?.quantity ?? samplesIn?.quantity ?? null;
}

/** The asked bands of a channel of that quantity; or why one cannot be had from it. */
export function bandsOf(
  asked: readonly AskedBand[],
  quantity: Quantity,
): Band[] | { readonly reason: string } {
  const bands: Band[] = [];
  for (const { id, fromHz, toHz, quantity: wanted } of asked) {
    const integrations = integrationsBetween(quantity, wanted ?? quantity);
    if (typeof integrations !== 'number') return { reason: `--band ${id}: ${integrations.reason}` };
    bands.push({
      id,
      formerly: [],
      quantity: wanted ?? quantity,
      from: fromHz,
      to: toHz,
      inOrders: false,
      display: usualDisplayUnit(wanted ?? quantity),
    });
  }
  return bands;
}

function disagreements(settings: OneOffSettings): string[] {
  const { samplesIn, sensitivity, bands } = settings;
  if (sensitivity !== null && samplesIn !== null && samplesIn.quantity !== 'voltage') {
    return [
      `--sensitivity is for samples in V, --samples-in says ${samplesIn.text}; leave out the one that is wrong`,
    ];
  }
  const quantity = quantityOf(settings);
  const made = quantity === null ? [] : bandsOf(bands, quantity);
  return 'reason' in made ? [made.reason] : [];
}

function fullScale(text: string, samplesIn: SampleUnit | null): Parsed<number> {
  const bare = Number(text);
  if (Number.isFinite(bare) && text.trim() !== '') return positive(bare, text);
  const parsed = parseSampleValue(text);
  if (!parsed.ok) return parsed;
  const { value, unit } = parsed.value;
  const wanted = samplesIn ?? { text: 'V', quantity: 'voltage', inSi: 1 };
  if (unit.quantity !== wanted.quantity)
    return refused(`'${text}' is not in the unit of the samples, ${wanted.text}`);
  return positive(value / wanted.inSi, text);
}

function positive(value: number, text: string): Parsed<number> {
  return value > 0 ? understood(value) : refused(`'${text}' is not above 0`);
}

/** Hz, or with its unit. */
export function frequency(text: string): Parsed<number> {
  const bare = Number(text);
  if (text.trim() !== '' && Number.isFinite(bare)) return positive(bare, text);
  const parsed = parseFrequency(text);
  return parsed.ok ? positive(parsed.value, text) : parsed;
}

function side(text: string): Parsed<'columns' | 'rows'> {
  if (text === 'columns' || text === 'rows') return understood(text);
  return refused(`'${text}' is neither columns nor rows`, nearest(text, ['columns', 'rows']));
}

export function windowName(text: string): Parsed<WindowName> {
  const found = windowNames.find((name) => name === text);
  if (found !== undefined) return understood(found);
  return refused(`'${text}' is no window (${windowNames.join(', ')})`, nearest(text, windowNames));
}

export function overlap(text: string): Parsed<number> {
  const percent = Number(text.replace(/\s*%$/, ''));
  if (text.trim() !== '' && percent >= 0 && percent <= 95) return understood(percent);
  return refused(`'${text}' is no overlap from 0 to 95 percent`);
}

export function segment(text: string): Parsed<number> {
  const samples = Number(text);
  const right = Number.isInteger(samples) && samples >= 8 && samples <= longestSegmentSamples;
  if (right && Number.isInteger(Math.log2(samples))) return understood(samples);
  const near = Number.isFinite(samples)
    ? 2 ** Math.min(22, Math.max(3, Math.round(Math.log2(Math.max(8, samples)))))
    : null;
  return refused(
    `'${text}' is no segment: a power of two from 8 to ${longestSegmentSamples} samples`,
    near === null ? null : String(near),
  );
}

const quantities: readonly Quantity[] = [
  'acceleration',
  'velocity',
  'displacement',
  'sound-pressure',
  'voltage',
  'current',
];

/** '10..1000', '2 kHz..8 kHz', '10..1000:velocity'. */
export function askedBand(text: string): Parsed<AskedBand> {
  const match = /^(.+?)\.\.([^:]+)(?::(.+))?$/.exec(text.trim());
  if (match === null) return refused('a band is FROM..TO[:QUANTITY] in Hz, such as 10..1000:velocity');
  const [, fromText = '', toText = '', word] = match;
  const [from, to] = [edge(fromText), edge(toText)];
  if (from === null || to === null)
    return refused(`'${from === null ? fromText : toText}' is no frequency in Hz`);
  if (!(from < to)) return refused('it does not end above its begin');
  const quantity = word === undefined ? null : quantities.find((one) => one === word.trim().toLowerCase());
  if (quantity === undefined) {
    const meant = nearest(word ?? '', quantities);
    return refused(
      `'${word}' is no quantity${meant === null ? ` (${quantities.join(', ')})` : `; ${meant}?`}`,
    );
  }
  return understood({ id: text.trim(), fromHz: from, toHz: to, quantity });
}

function edge(text: string): number | null {
  const bare = Number(text);
  if (text.trim() !== '' && Number.isFinite(bare)) return bare >= 0 ? bare : null;
  const parsed = parseFrequency(text);
  return parsed.ok && parsed.value >= 0 ? parsed.value : null;
}
