import { inseparable } from '../../assessment/evidence.ts';
import { frequencyOfFault } from '../../assessment/evidence-words.ts';
import {
  type CharacteristicFrequency,
  characteristicFrequencies,
  frequencyHz,
} from '../../assessment/fault-frequencies.ts';
import { type NeededSpacing, neededSpacings } from '../../assessment/part-spacings.ts';
import { pointMeaning } from '../../config/meaning.ts';
import type { Part } from '../../config/parts.ts';
import { printFrequency, printNumber } from '../../config/print-value.ts';
import type { Machine, Point } from '../../config/site.ts';
import { envelopePlan } from '../../manipulation/envelope-plan.ts';

/** What a part excites at the machine's nominal speed, and whether the lines of the points that hear it can tell. */
export interface PartCheck {
  readonly part: Part;
  /** Null in a machine without a nominal speed: then only multiples are known. */
  readonly frequencies: readonly { readonly one: CharacteristicFrequency; readonly hz: number | null }[];
  readonly points: readonly PartAtPoint[];
}

/** Of rolling bearings what lies beside the shaft's harmonics; of other parts, which lie on them, what takes finer lines. */
export interface PartAtPoint {
  readonly point: string;
  readonly spectrum: 'envelope' | 'plain';
  readonly lineSpacingHz: number;
  readonly notSeparable: readonly {
    readonly frequency: string;
    readonly harmonic: number;
    /** Null: no line spacing would. */
    readonly neededHz: number | null;
  }[];
  readonly notJudged: readonly NeededSpacing[];
}

/** As the judgement itself allows: a shaft may differ from its nominal speed by some percent. */
const withinNominal = 1.05;

export function partChecks({ parts = [], points, runningSpeedHz }: Machine): PartCheck[] {
  return parts.map((part) => ({
    part,
    frequencies: characteristicFrequencies(part).map((one) => ({
      one,
      hz: runningSpeedHz !== null ? frequencyHz(one, runningSpeedHz) : one.perTurn === 0 ? one.fixedHz : null,
    })),
    points: points.flatMap((point) => atPoint(part, point, runningSpeedHz)),
  }));
}

function atPoint(part: Part, point: Point, runningSpeedHz: number | null): PartAtPoint[] {
  if (!part.at.includes(point.id) || runningSpeedHz === null) return [];
  const isBearing = part.kind === 'rolling-bearing';
  const envelope = isBearing ? envelopePlan(point, point.recordings.sampleRateHz, null) : null;
  const lineSpacingHz =
    envelope === null
      ? (pointMeaning(point)?.lineSpacingHz ?? point.analysis.lineSpacingHz)
      : envelope.averaging.sampleRateHz / envelope.averaging.segmentSamples;
  const speed = { hz: runningSpeedHz, uncertaintyHz: 0 };
  return [
    {
      point: point.id,
      spectrum: envelope === null ? 'plain' : 'envelope',
      lineSpacingHz,
      notSeparable: inseparable([part], speed, lineSpacingHz).map(({ suspect, harmonic, neededHz }) => ({
        frequency: frequencyOfFault[suspect.fault],
        harmonic,
        neededHz,
      })),
      notJudged: neededSpacings(part, runningSpeedHz).filter(
        ({ neededHz }) => neededHz * withinNominal < lineSpacingHz,
      ),
    },
  ];
}

/** One line a part, and one for each way in which its points hear it. */
export function partTexts({ part, frequencies, points }: PartCheck): string[] {
  const said = frequencies.map(({ one, hz }) => {
    const what = one.kind === 'shaft' ? `${one.of.replace(/^the /, '')}` : one.kind;
    return `${what} ${hz === null ? `${printNumber(one.perTurn, 4)}x` : printFrequency(hz)}`;
  });
  const name = part.name === part.id ? part.id : `${part.id} (${part.name})`;
  const first = `${name}: ${said.length === 0 ? 'no frequency of its own' : said.join(', ')}`;
  const byText = new Map<string, string[]>();
  for (const one of points) {
    const text = part.kind === 'rolling-bearing' ? separationText(one) : judgementText(one);
    byText.set(text, [...(byText.get(text) ?? []), one.point]);
  }
  return [first, ...[...byText].map(([text, ids]) => `${part.id} at ${ids.join(', ')}: ${text}`)];
}

function separationText({ spectrum, lineSpacingHz, notSeparable }: PartAtPoint): string {
  const lines = `${spectrum === 'envelope' ? 'envelope lines' : 'lines'} ${printFrequency(lineSpacingHz)} apart`;
  if (notSeparable.length === 0) return `${lines} tell it from the shaft's harmonics`;
  const each = notSeparable.map(({ frequency, harmonic, neededHz }) => {
    const remedy = neededHz === null ? 'no line spacing would' : `${printFrequency(neededHz, 2)} would`;
    return `${frequency} from ${harmonic}x (${remedy})`;
  });
  return `${lines} cannot tell ${each.join(', ')}`;
}

function judgementText({ lineSpacingHz, notJudged }: PartAtPoint): string {
  const lines = `lines ${printFrequency(lineSpacingHz)} apart`;
  if (notJudged.length === 0) return `${lines} can judge it`;
  const each = notJudged.map(({ what, neededHz }) => {
    const remedy = neededHz === 0 ? 'no line spacing would' : `${printFrequency(neededHz, 2)} would`;
    return `${what} (${remedy})`;
  });
  return `${lines} cannot judge ${each.join(', ')}`;
}
