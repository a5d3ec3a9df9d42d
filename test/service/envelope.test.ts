/** Envelopes on their whole way: band limits, peaks in the ledger, the choice of the band that is demodulated. */
import { describe, expect, it } from 'vitest';
import { hiddenImpacts } from '../signal/hidden-impacts.ts';
import { seededRandom } from '../signal/random.ts';
import { beginMs, hourMs, stamp, type TrialService, wav } from './site-on-disk.ts';
import { serviceOn, site } from './trial.ts';

const rateHz = 25_600;
const pump = (envelope: string) => `recordings:
  sample_rate: 25.6 kHz
analysis:
  line_spacing: 1.6 Hz
${envelope}
bands:
  - id: shocks
    of: envelope
    from: 20 Hz
    to: 400 Hz
limits:
  - band: shocks
    alert: 0.3 m/s2
    on_delay: 2 recordings`;
const choosing = pump('  envelope:\n    choose: by kurtosis');

function damaged(seed: number, aboveNoiseDb = -3): Uint8Array {
  const impacts = {
    sampleRateHz: rateHz,
    durationS: 3,
    impactsPerS: 90,
    resonanceHz: 5200,
    halfWidthHz: 150,
  };
  return wav([hiddenImpacts(seededRandom(seed), { ...impacts, aboveNoiseDb, slip: 0.01 })], 1, rateHz);
}

/** The largest sample over and over at the top of every tenth of a second, as an overdriven input gives. */
function clipped(bytes: Uint8Array): Uint8Array {
  const view = new DataView(bytes.buffer, bytes.byteOffset);
  const samples = (bytes.length - 44) / 2;
  for (let n = 0; n < samples; n++) if (n % 2560 < 40) view.setInt16(44 + 2 * n, 32_767, true);
  return bytes;
}

async function send(service: TrialService, hour: number, bytes: Uint8Array): Promise<void> {
  service.toHour(hour);
  service.drop(`pump-2_${stamp(beginMs + hour * hourMs)}.wav`, bytes);
  await service.take();
}

const made = (service: TrialService) =>
  service.rows('envelopes', 'chosen, from_hz, to_hz', 'order by measurement_id');
const seriesOf = (service: TrialService) =>
  service.rows(
    'series',
    'id_in_site as band, count(*) as series',
    'join bands on bands.id = band_id group by 1',
  );
const choice = async (service: TrialService) => {
  const [row] = await service.rows('envelope_choices', 'choice');
  return row === undefined ? null : JSON.parse(row.choice as string);
};

it('a band of the envelope alarms like any other, and its peaks are in the ledger', async () => {
  const service = await serviceOn(site({ pump: pump('') }));
  for (let hour = 0; hour < 2; hour++) await send(service, hour, damaged(hour + 1, 3));
  expect(await service.standing()).toEqual(['shocks-fixed-upper pump-2/de-v alert']);
  expect(await made(service)).toEqual(Array(2).fill({ chosen: 'fixed', from_hz: 2000, to_hz: 8000 }));
  const [strongest] = await service.rows('envelope_peaks', 'frequency_hz, order_of_speed', 'where rank = 1');
  expect(Math.round(strongest?.frequency_hz as number) % 90).toBeLessThan(2);
  expect(await service.rows('envelope_choices', '*')).toEqual([]);
});

describe('a band chosen by kurtosis', () => {
  it('holds from the fifth recording that agrees on, begins a series, and outlives a restart', async () => {
    const on = site({ pump: choosing });
    const service = await serviceOn(on);
    for (let hour = 0; hour < 5; hour++) {
      expect(await choice(service)).toEqual(hour === 0 ? null : expect.objectContaining({ chosen: null }));
      await send(service, hour, damaged(hour + 1));
    }
    const { chosen } = await choice(service);
    expect(chosen.fromHz).toBeLessThan(5200);
    expect(chosen.toHz).toBeGreaterThan(5200);
    await send(service, 5, damaged(6));
    await service.stop();
    const again = await serviceOn(on, { clock: service.clock });
    await send(again, 6, damaged(7));
    const fixed = { chosen: 'fixed', from_hz: 2000, to_hz: 8000 };
    const byKurtosis = { chosen: 'kurtosis', from_hz: chosen.fromHz, to_hz: chosen.toHz };
    expect(await made(again)).toEqual([...Array(5).fill(fixed), byKurtosis, byKurtosis]);
    expect(await seriesOf(again)).toEqual([
      { band: 'overall', series: 1 },
      { band: 'shocks', series: 2 },
    ]);
  });

  it('is not decided by recordings that are late, nor by noise', async () => {
    const service = await serviceOn(site({ pump: choosing }));
    await send(service, 5, damaged(1));
    await send(service, 1, damaged(2));
    await send(service, 2, damaged(3));
    await send(service, 7, damaged(5, -60));
    const { winners } = await choice(service);
    expect(winners).toHaveLength(2);
    expect(winners[0]).not.toBeNull();
    expect(winners[1]).toBeNull();
  });

  it('is not decided while the machine stands still, nor by a clipped recording', async () => {
    const still = await serviceOn(site({ pump: `running: sidecar\n${choosing}` }));
    await send(still, 1, damaged(1));
    expect(await choice(still)).toEqual(expect.objectContaining({ winners: [expect.anything()] }));
    still.toHour(2);
    still.drop(`pump-2_${stamp(beginMs + 2 * hourMs)}.json`, '{"running": false}');
    await send(still, 2, damaged(2));
    await send(still, 3, clipped(damaged(3)));
    expect((await choice(still)).winners).toHaveLength(1);
  });
});
