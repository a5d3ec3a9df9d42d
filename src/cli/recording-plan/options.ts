import {
  type Parsed,
  parseDuration,
  parseFrequency,
  refused,
  splitNumber,
  understood,
} from '../../config/quantity.ts';
import type { Point, WindowName } from '../../config/site.ts';
import { type AskedBand, askedBand, frequency, overlap, segment, windowName } from '../analyse/options.ts';

/** As commander hands them over; what was not given is undefined. */
export interface PlanOptions {
  readonly lineSpacing?: string;
  readonly separate?: readonly string[];
  readonly confidence?: string;
  readonly speed?: string;
  readonly highest?: string;
  readonly band?: readonly string[];
  readonly window?: string;
  readonly overlap?: string;
  readonly mounting?: string;
  readonly recording?: string;
  readonly sampleRate?: string;
  readonly duration?: string;
  readonly segment?: string;
}

/** What was asked, in SI; null: not said. */
export interface AskedPlan {
  readonly lineSpacingHz: number | null;
  readonly separate: { readonly lowHz: number; readonly highHz: number } | null;
  readonly confidence: { readonly db: number; readonly percent: number } | null;
  readonly speed: { readonly slowestHz: number; readonly fastestHz: number } | null;
  readonly highestHz: number | null;
  readonly bands: readonly AskedBand[];
  readonly window: WindowName | null;
  readonly overlapPercent: number | null;
  readonly mounting: Point['mounting'];
  readonly recording: string | null;
  readonly sampleRateHz: number | null;
  readonly durationS: number | null;
  readonly segmentSamples: number | null;
}

/** Every option read, or the first that is wrong, in one line. */
export function readPlanOptions(options: PlanOptions): AskedPlan | { readonly wrong: string } {
  const problems: string[] = [];
  const read = <T>(name: string, text: string | undefined, parse: (text: string) => Parsed<T>): T | null => {
    if (text === undefined) return null;
    const parsed = parse(text);
    if (parsed.ok) return parsed.value;
    const instead = parsed.instead === null ? '' : `; write: ${name} '${parsed.instead}'`;
    problems.push(`${name}: ${parsed.what}${instead}`);
    return null;
  };
  const speed = read('--speed', options.speed, (text) => range(text, 'rpm'));
  const asked: AskedPlan = {
    lineSpacingHz: read('--line-spacing', options.lineSpacing, aboveZero),
    separate: read('--separate', options.separate?.join('..'), separation),
    confidence: read('--confidence', options.confidence, confidence),
    speed: speed && { slowestHz: speed.lowHz, fastestHz: speed.highHz },
    highestHz: read('--highest', options.highest, aboveZero),
    bands: (options.band ?? []).flatMap((text) => read('--band', text, askedBand) ?? []),
    window: read('--window', options.window, windowName),
    overlapPercent: read('--overlap', options.overlap, overlap),
    mounting: read('--mounting', options.mounting, mounting),
    recording: options.recording ?? null,
    sampleRateHz: read('--sample-rate', options.sampleRate, frequency),
    durationS: read('--duration', options.duration, (text) => {
      const parsed = parseDuration(text);
      if (!parsed.ok) return parsed;
      return parsed.value > 0 ? understood(parsed.value / 1000) : refused(`'${text}' is no length`, '10 s');
    }),
    segmentSamples: read('--segment', options.segment, segment),
  };
  if (options.recording !== undefined && options.duration !== undefined)
    problems.push('--duration: the recording itself says how long it is; leave one of the two out');
  if (options.segment !== undefined && options.lineSpacing !== undefined)
    problems.push('--segment: the line spacing says it already; leave one of the two out');
  return problems[0] === undefined ? asked : { wrong: problems[0] };
}

function aboveZero(text: string): Parsed<number> {
  const parsed = parseFrequency(text);
  if (!parsed.ok || parsed.value > 0) return parsed;
  return refused(`'${text}' is not above 0`);
}

/** '900 rpm..1500 rpm', '900..1500 rpm'; one value alone is a range of nothing. */
function range(text: string, example: string): Parsed<{ readonly lowHz: number; readonly highHz: number }> {
  const [first = '', second = first, ...more] = text.split('..').map((part) => part.trim());
  if (more.length > 0) return refused(`'${text}' is more than two values`);
  const unit = splitNumber(second);
  const bare = splitNumber(first);
  const from =
    bare.ok && bare.value.rest === '' && unit.ok && unit.value.rest !== ''
      ? `${first} ${unit.value.rest}`
      : first;
  const [low, high] = [parseFrequency(from, example), parseFrequency(second, example)];
  if (!low.ok) return low;
  if (!high.ok) return high;
  const [lowHz, highHz] = low.value <= high.value ? [low.value, high.value] : [high.value, low.value];
  return lowHz > 0 ? understood({ lowHz, highHz }) : refused(`'${text}' is not above 0`);
}

function separation(text: string): Parsed<{ readonly lowHz: number; readonly highHz: number }> {
  const parsed = range(text, 'Hz');
  if (!parsed.ok) return parsed;
  const { lowHz, highHz } = parsed.value;
  if (lowHz < highHz) return parsed;
  return refused(`'${text}' is not two frequencies`, '49.5 Hz..50 Hz');
}

/** '1 dB', '1 dB at 90 %'. */
function confidence(text: string): Parsed<{ readonly db: number; readonly percent: number }> {
  const match = /^(?:±|\+-|\+\/-)?\s*(\d*\.?\d+)\s*dB(?:\s+at\s+(\d*\.?\d+)\s*%)?$/iu.exec(text.trim());
  if (match === null) return refused(`'${text}' is no width of a level such as '1 dB' or '1 dB at 90 %'`);
  const [db, percent] = [Number(match[1]), Number(match[2] ?? 95)];
  if (!(db >= 0.01 && db <= 20)) return refused(`'${text}' is not from 0.01 dB to 20 dB`);
  if (!(percent >= 50 && percent <= 99.9)) return refused(`'${text}' is not at 50 % to 99.9 %`);
  return understood({ db, percent });
}

const mountings = ['stud', 'glue', 'magnet', 'hand'] as const;

function mounting(text: string): Parsed<(typeof mountings)[number]> {
  const found = mountings.find((one) => one === text.trim().toLowerCase());
  return found === undefined ? refused(`'${text}' is none of ${mountings.join(', ')}`) : understood(found);
}
