/**
 * Octave and one-third-octave bands of IEC 61260-1:2014 (5.2 to 5.5): octave ratio to the base ten, G = 10^(3/10),
 * reference frequency 1000 Hz; exact mid-band frequencies 1000 G^(x/b) for b = 1 or 3, edges at G^(-1/(2b)) and
 * G^(1/(2b)) of them, so that neighbours meet. A level summed from spectral lines between those edges is a
 * fractional-octave level; it has not passed the filters whose attenuation the standard bounds.
 */
export interface OctaveBand {
  /** As on the axis of a chart, in Hz: 31.5, 1000 (ISO 266). Differs from the exact mid by up to 1 %. */
  readonly nominalHz: number;
  readonly midHz: number;
  readonly fromHz: number;
  readonly toHz: number;
}

/** Bands an octave: 1 or 3. */
export type OctaveFraction = 1 | 3;

/** Nominal third-octave mid-bands of one decade (ISO 266, Renard series R10). */
const nominalOfDecade = [1, 1.25, 1.6, 2, 2.5, 3.15, 4, 5, 6.3, 8] as const;

/** Least and greatest nominal mid-band, Hz: within them the nominal names are the customary ones. */
export const octaveRangeHz = { from: 0.1, to: 1_000_000 } as const;

/**
 * The bands whose nominal mid-band lies in [fromHz, toHz], lowest first.
 * Checked: thirds, 1000 to 1000: exact mid 1000, edges 891.25094 and 1122.01845; octaves: 707.94578 and 1412.53754.
 */
export function octaveBands(fraction: OctaveFraction, fromHz: number, toHz: number): OctaveBand[] {
  const thirdsABand = 3 / fraction;
  const bands: OctaveBand[] = [];
  // A tenth of a decade is a third of an octave: in tenths, mid-bands and edges are whole and half numbers.
  const lowest = Math.ceil((10 * Math.log10(octaveRangeHz.from / 1000)) / thirdsABand);
  const highest = Math.floor((10 * Math.log10(octaveRangeHz.to / 1000)) / thirdsABand);
  for (let x = lowest; x <= highest; x++) {
    const tenths = x * thirdsABand;
    const nominalHz = nominal(tenths);
    if (nominalHz < fromHz || nominalHz > toHz) continue;
    bands.push({
      nominalHz,
      midHz: atTenths(tenths),
      fromHz: atTenths(tenths - thirdsABand / 2),
      toHz: atTenths(tenths + thirdsABand / 2),
    });
  }
  return bands;
}

/** 1000 x 10^(t/10); the same number for the edge that two neighbours share. */
function atTenths(tenths: number): number {
  return 1000 * 10 ** (tenths / 10);
}

function nominal(tenths: number): number {
  const place = ((tenths % 10) + 10) % 10;
  const decade = (tenths - place) / 10 + 3;
  return Number((nominalOfDecade[place] * 10 ** decade).toPrecision(3));
}
