import type { Part } from '../config/parts.ts';
import { characteristicFrequencies, frequencyHz } from './fault-frequencies.ts';
import { meshOf } from './gear-pictures.ts';
import { gridUncertainty } from './ordinary-lines.ts';
import { mainLobesApartLines } from './sidebands.ts';

/** What a part may show, and the widest distance between lines at which it can be judged. */
export interface NeededSpacing {
  readonly what: string;
  /** 0: no line spacing would do. */
  readonly neededHz: number;
}

/** Lines a turn from which a fault is named. */
const linesATurn = 25;

/** At the nominal speed, Hz. Bearings are judged by what lies beside their lines instead, and are not among these. */
export function neededSpacings(part: Part, runningHz: number): NeededSpacing[] {
  const aTurnHz = (part.shaft * runningHz) / linesATurn;
  const beside = (what: string, hz: number) => ({
    what,
    neededHz: Math.min(aTurnHz, hz / mainLobesApartLines),
  });
  switch (part.kind) {
    case 'gear-pair':
    case 'planetary-gear':
      return meshOf(part, runningHz).spacings.map(({ name, hz }) => beside(`sidebands at ${name(1)}`, hz));
    case 'electric-motor': {
      const grid = gridUncertainty * 2 * part.lineHz;
      const hz = Math.abs(2 * part.lineHz - part.poles * part.shaft * runningHz);
      return [beside('sidebands at the pole pass', hz > 2 * grid ? hz - grid : 0)];
    }
    case 'belt':
      return characteristicFrequencies(part).flatMap((one) =>
        one.kind === 'belt' ? [beside('the belt', frequencyHz(one, runningHz))] : [],
      );
    case 'vanes':
    case 'blades':
      return [beside('sidebands at its shaft', part.shaft * runningHz)];
    case 'coupling':
      return [beside('half orders', (part.shaft * runningHz) / 2)];
    case 'rolling-bearing':
      return [];
  }
}
