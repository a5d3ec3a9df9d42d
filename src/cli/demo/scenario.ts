import { type MachinePicture, machineSignal } from './machine-signal.ts';
import { seededNoise } from './noise.ts';
import { wavBytes } from './write-wav.ts';

/**
 * Larkfen Waterworks, an invented site: 45 days, a recording of 4 s at 12.8 kHz every 3 h from six points.
 *   blower-1  the drive-end bearing wears: impacts at 3.57 a turn grow from day 16 on
 *   pump-2    an unbalance grows from day 10 on; its non-drive end falls silent on day 33
 *   mixer-3   a gearbox that stands still at night and at weekends; its sidecar tells the speed
 *   fan-4     nothing wrong with the fan, but its sensor dies on day 40
 * Some files arrive corrupt: cut short, empty, or not a recording at all.
 */
export const sampleRateHz = 12_800;
export const frames = 4 * sampleRateHz;
export const days = 45;
export const stepMs = 3 * 3_600_000;
export const steps = (days * 86_400_000) / stepMs;
/** The loggers' full scale in volts, and their sensors: 100 mV/g. */
const fullScaleV = 5;
const voltsPerMs2 = 0.1 / 9.80665;

export interface DroppedFile {
  readonly name: string;
  readonly bytes: Uint8Array;
}

/** The files that the loggers write at `startMs`, step `step` of the story. */
export function filesOfStep(step: number, startMs: number, seed: number): DroppedFile[] {
  const day = (step * stepMs) / 86_400_000;
  const stamp = `${new Date(startMs).toISOString().slice(0, 19).replace(/[-:]/g, '')}Z`;
  const noiseOf = (stream: number) => seededNoise(seed + step * 16 + stream);
  const load = 1 + 0.06 * Math.sin(2 * Math.PI * (day - 0.3)) + 0.02 * noiseOf(9).gaussian();
  const files: DroppedFile[] = [
    {
      name: `blower-1_${stamp}.wav`,
      bytes: recording([
        signal(blower(day, load, true), noiseOf(0)),
        signal(blower(day, load, false), noiseOf(1)),
      ]),
    },
    { name: `pump-2_de-v_${stamp}.wav`, bytes: recording([signal(pump(day, load, true), noiseOf(2))]) },
    ...(day < 33
      ? [
          {
            name: `pump-2_nde-v_${stamp}.wav`,
            bytes: recording([signal(pump(day, load, false), noiseOf(3))]),
          },
        ]
      : []),
    ...mixerFiles(startMs, stamp, load, noiseOf(4)),
    { name: `fan-4_${stamp}.wav`, bytes: recording([fan(day, load, noiseOf(5))]) },
  ];
  return [...files.map((file) => spoiled(file, step)), ...strangers(step, stamp)];
}

function signal(picture: MachinePicture, noise: ReturnType<typeof seededNoise>): Float64Array {
  return machineSignal(picture, frames, sampleRateHz, noise);
}

function recording(channels: readonly Float64Array[]): Uint8Array {
  const perFullScale = voltsPerMs2 / fullScaleV;
  return wavBytes(
    channels.map((channel) => channel.map((value) => value * perFullScale)),
    sampleRateHz,
  );
}

/** Outer race of the drive-end bearing: nothing until day 16, then doubling every five days. */
function blower(day: number, load: number, driveEnd: boolean): MachinePicture {
  const wear = driveEnd && day > 16 ? 2.2 * (2 ** ((day - 16) / 5) - 1) : 0;
  return {
    shaftHz: (2970 / 60) * (1 - 0.002 * (load - 1)),
    harmonicsMmS: driveEnd ? [1.3 * load, 0.35, 0.2, 0.1] : [1.0 * load, 0.3, 0.15],
    mesh: null,
    resonance: { hz: driveEnd ? 3150 : 2900, damping: 0.03 },
    impacts: wear > 0 ? { perTurn: 3.572, peak: wear, slip: 0.01 } : null,
    noise: { white: 0.25, shaped: 0.8 * load },
  };
}

/** 1x grows from 1.1 mm/s on day 10 by 7 % of its start a day. */
function pump(day: number, load: number, driveEnd: boolean): MachinePicture {
  const unbalance = 1.1 * (1 + 0.07 * Math.max(0, day - 10));
  return {
    shaftHz: (1480 / 60) * (1 - 0.004 * (load - 1)),
    harmonicsMmS: driveEnd
      ? [unbalance, 0.4 * load, 0.15, 0.1, 0.35 * load]
      : [0.75 * unbalance, 0.3 * load, 0.1],
    mesh: null,
    resonance: { hz: 1900, damping: 0.05 },
    impacts: null,
    noise: { white: 0.2, shaped: 0.6 * load },
  };
}

/** Runs from 06:00 to 20:00 on weekdays; standing still it shows little but the building. */
function mixerFiles(
  startMs: number,
  stamp: string,
  load: number,
  noise: ReturnType<typeof seededNoise>,
): DroppedFile[] {
  const start = new Date(startMs);
  const weekday = start.getUTCDay() >= 1 && start.getUTCDay() <= 5;
  const runs = weekday && start.getUTCHours() >= 6 && start.getUTCHours() < 20;
  const rpm = runs ? 1455 - 15 * (load - 1) : 0;
  const picture: MachinePicture = {
    shaftHz: runs ? rpm / 60 : 25,
    harmonicsMmS: runs ? [0.8 * load, 0.3, 0.1] : [0.01],
    mesh: runs ? { teeth: 21, rms: 1.6 * load, modulation: 0.2 } : null,
    resonance: { hz: 2400, damping: 0.04 },
    impacts: null,
    noise: runs ? { white: 0.25, shaped: 0.7 } : { white: 0.05, shaped: 0.02 },
  };
  const sidecar = JSON.stringify({
    speed_rpm: Math.round(rpm * 10) / 10,
    load_percent: runs ? Math.round(70 * load) : 0,
  });
  return [
    { name: `mixer-3_${stamp}.wav`, bytes: recording([signal(picture, noise)]) },
    { name: `mixer-3_${stamp}.json`, bytes: new TextEncoder().encode(sidecar) },
  ];
}

/** m/s² that the hum of a broken cable looks like, at 1, 2, 3 ... times the mains frequency. */
const humMs2 = [0.6, 0.05, 0.18, 0.02, 0.09];

/** From day 40 on the cable is broken: mains hum is all that comes. */
function fan(day: number, load: number, noise: ReturnType<typeof seededNoise>): Float64Array {
  if (day >= 40) {
    return new Float64Array(frames).map((_, n) => {
      const turn = (2 * Math.PI * 50 * n) / sampleRateHz;
      const hum = humMs2.reduce((sum, height, k) => sum + height * Math.sin((k + 1) * turn + 0.7 * k), 0);
      return hum + 0.02 * noise.gaussian();
    });
  }
  return signal(
    {
      shaftHz: (1120 / 60) * (1 - 0.003 * (load - 1)),
      harmonicsMmS: [1.5 * load, 0.4, 0.2, 0.1, 0.1, 0.1, 0.3],
      mesh: null,
      resonance: { hz: 1400, damping: 0.06 },
      impacts: null,
      noise: { white: 0.2, shaped: 0.5 * load },
    },
    noise,
  );
}

/** A few files that arrive broken. */
function spoiled(file: DroppedFile, step: number): DroppedFile {
  if (step === 61 && file.name.startsWith('fan-4')) return { ...file, bytes: file.bytes.slice(0, 30_000) };
  if (step === 148 && file.name.startsWith('pump-2_de')) return { ...file, bytes: new Uint8Array(0) };
  if (step === 233 && file.name.startsWith('blower-1'))
    return { ...file, bytes: new TextEncoder().encode('transfer aborted') };
  return file;
}

/** A file that no point takes. */
function strangers(step: number, stamp: string): DroppedFile[] {
  return step === 200
    ? [{ name: `chiller-9_${stamp}.wav`, bytes: wavBytes([new Float64Array(1280)], sampleRateHz) }]
    : [];
}
