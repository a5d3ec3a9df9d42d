/** A stored spectrum, as far as thinning looks at it. */
export interface SpectrumKept {
  readonly measurementId: number;
  readonly usedMs: number;
  readonly atAlarm: boolean;
}

export type KeepReason = 'newest' | 'at-alarm' | 'needed' | 'one-a-day';

export interface ThinningRule {
  /** How many of the newest of a point are kept. */
  readonly newest: number;
  /** Name of the local day, in the site's zone, to which a used time belongs. */
  readonly dayOf: (usedMs: number) => string;
  /** Measurements that an open pooling, a standing alarm or a baseline still needs. */
  readonly needed?: ReadonlySet<number>;
}

export const newestSpectraKept = 50;

export interface Thinning {
  /** In the order of used time. `reason`: the first that holds, in the order of KeepReason. */
  readonly kept: readonly { readonly measurementId: number; readonly reason: KeepReason }[];
  readonly removed: readonly number[];
}

/**
 * Which spectra of one point are kept: the newest ones, every one at which an alarm changed, every one that is
 * needed, and the first of each day. Pure; the order of `spectra` does not matter. The first of a day and not the last, so
 * that the choice of a day does not change while the day goes on.
 */
export function thinSpectra(spectra: readonly SpectrumKept[], rule: ThinningRule): Thinning {
  const inOrder = [...spectra].sort((a, b) => a.usedMs - b.usedMs || a.measurementId - b.measurementId);
  const firstNewest = Math.max(0, inOrder.length - rule.newest);
  const days = new Set<string>();
  const kept: { measurementId: number; reason: KeepReason }[] = [];
  const removed: number[] = [];
  for (const [index, spectrum] of inOrder.entries()) {
    const { measurementId } = spectrum;
    const day = rule.dayOf(spectrum.usedMs);
    const firstOfDay = !days.has(day);
    days.add(day);
    const reason = reasonToKeep(spectrum, rule, index >= firstNewest, firstOfDay);
    if (reason === null) removed.push(measurementId);
    else kept.push({ measurementId, reason });
  }
  return { kept, removed };
}

function reasonToKeep(
  spectrum: SpectrumKept,
  rule: ThinningRule,
  isNewest: boolean,
  firstOfDay: boolean,
): KeepReason | null {
  if (isNewest) return 'newest';
  if (spectrum.atAlarm) return 'at-alarm';
  if (rule.needed?.has(spectrum.measurementId)) return 'needed';
  return firstOfDay ? 'one-a-day' : null;
}
