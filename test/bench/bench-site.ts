import { mkdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { machineSignal } from '../../src/cli/demo/machine-signal.ts';
import { seededNoise } from '../../src/cli/demo/noise.ts';
import { wavBytes } from '../../src/cli/demo/write-wav.ts';
import { readSiteFile, type SiteFile } from '../../src/service/site-in-force.ts';

/** What is measured throughout: 10 s at 25.6 kHz, one channel of 16 bits, 31 averages of 16384 samples, six bands. */
export const sampleRateHz = 25_600;
export const durationS = 10;
const frames = sampleRateHz * durationS;
const seed = 20261201;

const siteText = `site: Speed bench
time_zone: UTC
folders:
  drop: ./drop
  data: ./data
  after_reading: archive
recordings:
  files: <machine>_<any>.wav
  start_in_name: <year><month><day>T<hour><minute><second>Z
  clock: UTC
  sample_rate: 25.6 kHz
  duration: 10 s
  expected_every: 1 min
  overdue_after: 10 min
  settle: 5 s
  samples_in: V
  full_scale: 5 V
analysis:
  window: hann
  overlap: 50 %
  line_spacing: 1.6 Hz
machine_types:
  rotating:
    bands:
      - { id: overall, quantity: velocity, from: 10 Hz, to: 1000 Hz, unit: mm/s }
      - { id: shaft, quantity: velocity, from: 20 Hz, to: 120 Hz, unit: mm/s }
      - { id: low, quantity: acceleration, from: 10 Hz, to: 1000 Hz, unit: m/s2 }
      - { id: middle, quantity: acceleration, from: 1 kHz, to: 3 kHz, unit: m/s2 }
      - { id: bearing, quantity: acceleration, from: 2 kHz, to: 5 kHz, unit: m/s2 }
      - { id: whole, quantity: acceleration, from: 10 Hz, to: 10 kHz, unit: m/s2 }
    limits:
      - { band: overall, alert: 2.8 mm/s, danger: 4.5 mm/s }
      - { band: bearing, alert: 4 m/s2, danger: 12 m/s2 }
machines:
  - id: pump-1
    name: Pump 1
    type: rotating
    running_speed: 1480 rpm
    points:
      - id: de-h
        name: drive end horizontal
        direction: horizontal
        mounting: stud
        channel: 1
        quantity: acceleration
        sensitivity: 100 mV/g
mail:
  from: Speed bench <bench@bench.example>
  server: { host: 127.0.0.1, port: 2525, security: none }
  to:
    - address: bench@bench.example
`;

/** A bearing that the point hears: its envelope is made, faults are looked for in both spectra. */
const partsText = `    parts:
      - id: de-bearing
        kind: rolling-bearing
        rolling_elements: 9
        element_diameter: 7.94 mm
        pitch_diameter: 38.5 mm
`;

/** Writes the site into a folder and reads it as the service does. `parts`: with envelope and evidence. */
export function makeSite(folder: string, parts = false): SiteFile {
  mkdirSync(join(folder, 'drop'), { recursive: true });
  const path = join(folder, 'site.yaml');
  writeFileSync(path, parts ? siteText.replace('mail:\n', `${partsText}mail:\n`) : siteText);
  const read = readSiteFile(path);
  if ('problems' in read) throw new Error(read.problems.join('\n'));
  return read;
}

/** One file: a pump with harmonics, a worn bearing and broadband noise; another of them for every `index`. */
export function recordingBytes(index: number): Uint8Array {
  const signal = machineSignal(
    {
      shaftHz: 24.6,
      harmonicsMmS: [1.2, 0.4, 0.2, 0.1, 0.3],
      mesh: { teeth: 21, rms: 1.2, modulation: 0.2 },
      resonance: { hz: 3150, damping: 0.03 },
      impacts: { perTurn: 3.572, peak: 6, slip: 0.01 },
      noise: { white: 0.2, shaped: 0.6 },
    },
    frames,
    sampleRateHz,
    seededNoise(seed + index),
  );
  const perFullScale = 0.1 / 9.80665 / 5;
  return wavBytes([signal.map((value) => value * perFullScale)], sampleRateHz);
}

/** Name of the file whose recording began then. */
export function recordingName(startMs: number): string {
  return `pump-1_${new Date(startMs).toISOString().slice(0, 19).replace(/[-:]/g, '')}Z.wav`;
}
