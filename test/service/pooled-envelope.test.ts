/** Bursts of a tenth of a second from a hidden bearing fault, through the service: one shows nothing, thirty do. */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { expect, it, onTestFinished } from 'vitest';
import { wavBytes } from '../../src/cli/demo/write-wav.ts';
import { Measurer } from '../../src/manipulation/measure.ts';
import { hiddenImpacts } from '../signal/hidden-impacts.ts';
import { seededRandom } from '../signal/random.ts';
import { beginMs, type SiteOnDisk, siteAt, stamp } from './site-on-disk.ts';
import { serviceOn } from './trial.ts';

const sampleRateHz = 25_600;
/** Between the lines 4 and 5 of an envelope whose lines lie 25 Hz apart. */
const impactsPerS = 120;
const everyMs = 60_000;

const text = `site: Trial works
time_zone: Europe/Dublin
folders:
  drop: ./drop
  data: ./data
recordings:
  files: <machine>_<any>.wav
  start_in_name: <year><month><day>T<hour><minute><second>Z
  sample_rate: 25.6 kHz
  duration: 0.1 s
  expected_every: 1 min
  overdue_after: 10 min
  samples_in: m/s2
  full_scale: 100 m/s2
analysis:
  average_over: 30 recordings
  envelope:
    from: 2 kHz
    to: 8 kHz
machines:
  - id: pump-2
    running_speed: 1500 rpm
    parts:
      - id: drive-end
        kind: rolling-bearing
        at: [de-v]
        shaft: 1x
        bpfo: 4.8x
        bpfi: 7.2x
    points:
      - id: de-v
        channel: 1
        quantity: acceleration
        bands:
          - id: high
            from: 2 kHz
            to: 8 kHz
          - id: shocks
            of: envelope
            from: 75 Hz
            to: 500 Hz
`;

/** The same thirty bursts each time. */
function* thirtyBursts(): Generator<Float64Array> {
  const random = seededRandom(20261201);
  const fault = { impactsPerS, resonanceHz: 4000, halfWidthHz: 300, aboveNoiseDb: -6, slip: 0.01 };
  for (let n = 0; n < 30; n++) yield hiddenImpacts(random, { sampleRateHz, durationS: 0.1, ...fault });
}

function burstSite(): SiteOnDisk {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-bursts-'));
  const remove = () => rmSync(folder, { recursive: true, force: true });
  onTestFinished(remove);
  mkdirSync(join(folder, 'drop'));
  writeFileSync(join(folder, 'site.yaml'), text);
  return { ...siteAt(folder), remove };
}

it('thirty bursts averaged show the line of impacts 6 dB below the noise, and name no fault at 25 Hz a line', async () => {
  const service = await serviceOn(burstSite());
  let n = 0;
  for (const samples of thirtyBursts()) {
    service.clock.advance(Math.max(0, beginMs + n * everyMs + 10_000 - service.clock.wallMs()));
    const bytes = wavBytes([samples.map((value) => value / 100)], sampleRateHz);
    service.drop(`pump-2_${stamp(beginMs + n * everyMs)}.wav`, bytes);
    await service.take();
    n++;
  }
  const lines = await service.rows(
    'envelope_peaks',
    'used_ms, above_floor_db',
    `join measurements on measurements.id = measurement_id where abs(frequency_hz - ${impactsPerS}) < 12.5`,
  );
  expect(lines).toEqual([{ used_ms: beginMs + 29 * everyMs, above_floor_db: expect.any(Number) }]);
  expect(Number(lines[0].above_floor_db)).toBeGreaterThan(6);
  expect(await service.rows('envelopes', 'line_spacing_hz, averages')).toEqual([
    { line_spacing_hz: 25, averages: 60 },
  ]);
  const levels = await service.rows('levels', 'in_trend');
  expect(levels).toEqual([{ in_trend: 1 }, { in_trend: 1 }]);
  expect(await service.rows('evidence', 'part')).toEqual([]);
  expect(await service.rows('envelope_peaks', 'names', 'where names is not null')).toEqual([]);
  expect(await service.rows('open_pools', 'recordings')).toEqual([]);
});

it('one of the same bursts by itself hardly ever shows it', () => {
  const [{ points }] = burstSite().siteFile.site.machines;
  const [point] = points;
  let found = 0;
  for (const samples of thirtyBursts()) {
    const measurer = new Measurer({
      point,
      channel: '1',
      sampleRateHz,
      siPerSample: 1,
      signal: point.signal,
      sidecar: null,
      check: null,
    });
    measurer.add(samples);
    measurer.end({ timeStepDeviation: null });
    const { envelope } = measurer.finish({ speed: null, findings: [] });
    expect(envelope?.averaging.averages).toBe(2);
    if (envelope?.peaks.some(({ frequencyHz }) => Math.abs(frequencyHz - impactsPerS) < 12.5)) found++;
  }
  expect(found).toBeLessThanOrEqual(4);
});
