import type { RecordingLayers } from './build-settings.ts';
import { type Build, innermost } from './layers.ts';
import type { Sensitivity } from './sensitivity.ts';
import type { Written } from './shape.ts';
import type { Quantity, SampleUnit, SignalSettings } from './site.ts';
import type { Span } from './site-text.ts';
import { siUnit, unitsFor } from './units.ts';

/** What the samples of a point are, and how they become its quantity; null where that was refused. */
export function buildSignal(
  build: Build,
  layers: RecordingLayers,
  point: {
    readonly quantity: Quantity;
    readonly sensitivity: Written<Sensitivity> | null;
    readonly sensitivityRefused: boolean;
    readonly at: Span;
    readonly shown: string;
  },
): SignalSettings | null {
  const { reading } = build;
  const { quantity, sensitivity, at, shown } = point;
  if (point.sensitivityRefused) return null;
  if (sensitivity !== null && sensitivity.value.quantity !== quantity) {
    const what = `the sensitivity is per ${sensitivity.value.quantity}, the quantity of ${shown} is ${quantity}`;
    reading.problem(
      sensitivity.at,
      what,
      `write: quantity: ${sensitivity.value.quantity}, or another sensitivity`,
    );
    return null;
  }
  const samplesIn = sampleUnit(build, layers, point);
  if (samplesIn === null) return null;
  if (sensitivity !== null && samplesIn.quantity !== 'voltage') {
    const where = innermost(layers, 'samples_in');
    const what = `samples of ${shown} stand in ${samplesIn.text} already, so a sensitivity does not apply`;
    reading.problem(
      sensitivity.at,
      what,
      `write samples_in: V${where === null ? '' : ` in line ${reading.lineOf(where.at)}`}, or leave the sensitivity out`,
    );
    return null;
  }
  if (sensitivity === null && samplesIn.quantity !== quantity) {
    const volts = samplesIn.quantity === 'voltage' && quantity !== 'other';
    const what = volts
      ? `samples of ${shown} are in ${samplesIn.text} and it has no sensitivity`
      : `samples of ${shown} are in ${samplesIn.text}, its quantity is ${quantity}`;
    const right = volts
      ? `add: sensitivity: ${exampleOf(quantity)}`
      : `write samples_in: ${unitsFor(quantity)}, or another quantity`;
    reading.problem(at, what, right);
    return null;
  }
  return {
    samplesIn,
    fullScale: fullScale(build, layers, samplesIn, shown),
    sensitivity: sensitivity === null ? null : sensitivity.value.voltsPerSi,
    sensitivityText:
      sensitivity === null
        ? null
        : reading.text.slice(sensitivity.at.from, sensitivity.at.to).replace(/^['"]|['"]$/g, ''),
  };
}

function exampleOf(quantity: Quantity): string {
  if (quantity === 'velocity') return '4 mV/(mm/s)';
  if (quantity === 'displacement') return '8 V/mm';
  if (quantity === 'sound-pressure') return '50 mV/Pa';
  return quantity === 'current' ? '100 mV/A' : '100 mV/g';
}

function sampleUnit(
  { reading }: Build,
  layers: RecordingLayers,
  { quantity, sensitivity, at, shown }: Parameters<typeof buildSignal>[2],
): SampleUnit | null {
  const written = innermost(layers, 'samples_in');
  if (written === null) {
    if (sensitivity !== null || quantity === 'voltage') return siUnit('voltage');
    const what = `it is not said what the samples of ${shown} are`;
    const unit = quantity === 'other' ? '°C' : unitsFor(quantity).split(/, | or /)[0];
    reading.problem(
      at,
      what,
      `write under recordings: samples_in: ${unit}, or add: sensitivity: ${exampleOf(quantity)}`,
    );
    return null;
  }
  const { text, parsed } = written.value;
  if (parsed.ok) return parsed.value;
  if (quantity === 'other' && text.length <= 12) return { text, quantity, inSi: 1 };
  const right =
    parsed.instead === null ? 'write for example: samples_in: V' : reading.write(written.at, parsed.instead);
  reading.problem(written.at, `samples_in: ${parsed.what}`, right, 'samples_in');
  return null;
}

/** In `samplesIn`: `full_scale: 10 V` with samples in mV is 10000. */
function fullScale(
  { reading }: Build,
  layers: RecordingLayers,
  samplesIn: SampleUnit,
  shown: string,
): number | null {
  const written = innermost(layers, 'full_scale');
  if (written === null) return null;
  const { value, unit } = written.value;
  if (unit.quantity !== samplesIn.quantity) {
    const what = `full_scale is in ${unit.text}, samples of ${shown} are in ${samplesIn.text}`;
    reading.problem(written.at, what, `write it in ${samplesIn.text}`, 'full scale');
    return null;
  }
  if (value > 0) return Number((value / samplesIn.inSi).toPrecision(15));
  reading.problem(written.at, 'full_scale is not above 0', 'write: full_scale: 10 V', 'full scale');
  return null;
}
