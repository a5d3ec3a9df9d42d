import type { Noise } from './noise.ts';

/**
 * The acceleration at a bearing housing, m/s², built from what makes it: the shaft's harmonics, a gear mesh with
 * sidebands at shaft speed, impacts that ring a structural resonance, and broadband noise through the same structure.
 */
export interface MachinePicture {
  readonly shaftHz: number;
  /** r.m.s. velocity of 1x, 2x, 3x ..., mm/s. */
  readonly harmonicsMmS: readonly number[];
  readonly mesh: { readonly teeth: number; readonly rms: number; readonly modulation: number } | null;
  readonly resonance: { readonly hz: number; readonly damping: number };
  /** Impacts a turn of the shaft and the acceleration that each adds at the resonance; slip scatters their spacing. */
  readonly impacts: { readonly perTurn: number; readonly peak: number; readonly slip: number } | null;
  /** r.m.s. of the white noise, and of the noise that the resonance shapes. */
  readonly noise: { readonly white: number; readonly shaped: number };
}

export function machineSignal(
  picture: MachinePicture,
  frames: number,
  sampleRateHz: number,
  noise: Noise,
): Float64Array {
  const out = new Float64Array(frames);
  addHarmonics(out, picture, sampleRateHz, noise);
  if (picture.mesh !== null) addMesh(out, picture.shaftHz, picture.mesh, sampleRateHz, noise);
  addStructure(out, picture, sampleRateHz, noise);
  return out;
}

function addHarmonics(out: Float64Array, picture: MachinePicture, sampleRateHz: number, noise: Noise): void {
  picture.harmonicsMmS.forEach((velocity, index) => {
    const hz = picture.shaftHz * (index + 1);
    const amplitude = Math.SQRT2 * velocity * 1e-3 * 2 * Math.PI * hz;
    addTone(out, amplitude, hz / sampleRateHz, 2 * Math.PI * noise.uniform());
  });
}

function addMesh(
  out: Float64Array,
  shaftHz: number,
  mesh: NonNullable<MachinePicture['mesh']>,
  sampleRateHz: number,
  noise: Noise,
): void {
  const amplitude = Math.SQRT2 * mesh.rms;
  const phase = 2 * Math.PI * noise.uniform();
  addTone(out, amplitude, (mesh.teeth * shaftHz) / sampleRateHz, phase);
  for (const side of [-1, 1]) {
    addTone(out, (amplitude * mesh.modulation) / 2, ((mesh.teeth + side) * shaftHz) / sampleRateHz, phase);
  }
  addTone(out, amplitude * 0.3, (2 * mesh.teeth * shaftHz) / sampleRateHz, 2 * phase);
}

/** Adds amplitude cos(2 pi f n + phase) by rotation; f in cycles a sample. */
function addTone(out: Float64Array, amplitude: number, cyclesPerSample: number, phase: number): void {
  const step = 2 * Math.PI * cyclesPerSample;
  const [cosStep, sinStep] = [Math.cos(step), Math.sin(step)];
  let re = amplitude * Math.cos(phase);
  let im = amplitude * Math.sin(phase);
  for (let n = 0; n < out.length; n++) {
    out[n] += re;
    const turned = re * cosStep - im * sinStep;
    im = re * sinStep + im * cosStep;
    re = turned;
  }
}

/** Impacts and noise through one resonance (a two-pole filter), white noise beside it. */
function addStructure(out: Float64Array, picture: MachinePicture, sampleRateHz: number, noise: Noise): void {
  const { hz, damping } = picture.resonance;
  const omega = (2 * Math.PI * hz) / sampleRateHz;
  const decay = Math.exp(-damping * omega);
  const a1 = 2 * decay * Math.cos(omega * Math.sqrt(1 - damping * damping));
  const a2 = -decay * decay;
  // Gain of the filter for white noise, so that `shaped` is the r.m.s. that comes out.
  const noiseGain = Math.sqrt((1 - a2) / (1 + a2) / ((1 - a2) ** 2 - a1 * a1));
  const drive = picture.noise.shaped / noiseGain;
  const impacts = picture.impacts;
  const spacing =
    impacts === null ? Number.POSITIVE_INFINITY : sampleRateHz / (impacts.perTurn * picture.shaftHz);
  let nextImpact = impacts === null ? Number.POSITIVE_INFINITY : spacing * noise.uniform();
  let y1 = 0;
  let y2 = 0;
  for (let n = 0; n < out.length; n++) {
    let push = drive * noise.gaussian();
    if (n >= nextImpact && impacts !== null) {
      push += impacts.peak * Math.sin(omega) * (0.8 + 0.4 * noise.uniform());
      nextImpact += spacing * (1 + impacts.slip * noise.gaussian());
    }
    const y = push + a1 * y1 + a2 * y2;
    y2 = y1;
    y1 = y;
    out[n] += y + picture.noise.white * noise.gaussian();
  }
}
