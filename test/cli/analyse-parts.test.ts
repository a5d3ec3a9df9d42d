import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { wavFile } from '../acquisition/wav-writer.ts';
import { SampledMachine } from '../assessment/sampled-machine.ts';
import { seededRandom } from '../signal/random.ts';
import { run } from './small-site.ts';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'humledger-parts-'));
});
afterAll(() => rmSync(folder, { recursive: true }));

const site = `site: Larkfen Waterworks
time_zone: Europe/Dublin
folders:
  drop: ./drop
  data: ./data
recordings:
  files: <machine>_<any>.wav
  sample_rate: 5120 Hz
  duration: 25 s
  expected_every: 1 h
  samples_in: m/s2
analysis:
  line_spacing: 0.35 Hz
machine_types:
  rotating:
    bands:
      - id: overall
        quantity: velocity
        from: 10 Hz
        to: 1000 Hz
    limits:
      - band: overall
        alert: 2.8 mm/s
machines:
  - id: blower-2
    type: rotating
    running_speed: 1480 rpm
    points:
      - id: gearbox
        channel: 1
        quantity: acceleration
    parts:
      - id: motor
        name: drive motor
        kind: electric-motor
        line_frequency: 50 Hz
        poles: 4
      - id: gears
        name: step-up gears
        kind: gear-pair
        teeth: 67
        mating_teeth: 23
`;

// 1480 r/min: mesh 67 x 24.667 = 1652.7 Hz, mating shaft 71.86 Hz; twice line 1.333 Hz from 4x.
function recording(): Uint8Array {
  const shaftHz = 1480 / 60;
  const machine = new SampledMachine(seededRandom(20261201), 5120, 2 ** 17, 1);
  for (const [turns, amplitude] of [0.8, 0.4, 0.2, 0.2, 0.1].entries())
    machine.tone((turns + 1) * shaftHz, amplitude);
  machine.tone(100, 0.3);
  machine.tone(67 * shaftHz, 0.8);
  machine.sidebands(
    67 * shaftHz,
    (67 * shaftHz) / 23,
    [0.5, 0.3, 0.2].map((part) => 0.8 * part),
  );
  const data = new Uint8Array(machine.samples.buffer);
  return wavFile({ code: 3, bits: 64, channels: 1, rateHz: 5120, data });
}

test('a technician reads which gear the sidebands lead to, what is electrical, and what takes finer lines', async () => {
  writeFileSync(join(folder, 'site.yaml'), site);
  writeFileSync(join(folder, 'blower-2_1.wav'), recording());
  const ran = await run(['analyse', 'blower-2_1.wav'], { workingFolder: folder });
  expect(ran.err).toBe('');
  const from = ran.out.indexOf('  evidence');
  expect(ran.out.slice(from, ran.out.indexOf('\n\n', from))).toBe(
    `
  evidence   clear: six sidebands at mating shaft 1x around the mesh of the
             step-up gears (1653 Hz), the strongest 6 dB under its line, 28 dB
             over the floor; common practice: the mating gear: wear, run-out or
             a tooth
             observed: a line at twice line of the drive motor (100 Hz), 1.33 Hz
             from 4x, 17 dB over the floor; common practice: electrical, of no
             fault while it stays as it is
             not separable: pole-pass sidebands of the drive motor (1.331 Hz
             beside it) cannot be told from 1x in the spectrum; lines 0.28 Hz
             apart or closer would
             Evidence, never a verdict. It says where to look first; something
             else may make such lines.`.slice(1),
  );
  expect(ran.out).toMatch(/1580\.81 .* gear mesh - mating\n/);
});
