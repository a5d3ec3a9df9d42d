/** Samples that are not what they should be: flagged, measured as far as they go, and limits still evaluated. */
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { wavFile } from '../acquisition/wav-writer.ts';
import {
  beginMs,
  frames,
  hourMs,
  sampleRateHz,
  signal,
  siteAt,
  stamp,
  type TrialService,
  wav,
} from '../service/site-on-disk.ts';
import { serviceOn, site, trial } from '../service/trial.ts';

/** Nobody is overdue while one machine after the other is looked at. */
const patient = { recordings: 'overdue_after: 100 h' };
const pump = (hour: number, ending = 'wav') => `pump-2_${stamp(beginMs + hour * hourMs)}.${ending}`;

/** 32-bit floats, which stand for m/s2 as they are. */
function floats(samples: Float64Array): Uint8Array {
  const data = new Uint8Array(Float32Array.from(samples).buffer);
  return wavFile({ code: 3, bits: 32, rateHz: sampleRateHz, data });
}

interface Measured {
  readonly flags: readonly string[];
  readonly levels: readonly number[];
  readonly rms: number | null;
}

async function measured(
  service: TrialService,
  hour: number,
  bytes: Uint8Array | string,
  ending = 'wav',
): Promise<Measured> {
  service.toHour(hour);
  service.drop(pump(hour, ending), bytes);
  await service.take();
  // What ends in zeros is waited for first.
  await service.after(600_000);
  const at = beginMs + hour * hourMs;
  const [row] = await service.rows('measurements', 'quality, rms', `where used_ms = ${at}`);
  const levels = await service.rows('levels', 'level', `where used_ms = ${at}`);
  return {
    flags:
      row === undefined
        ? ['nothing measured']
        : JSON.parse(row.quality as string).map(({ flag }: { flag: string }) => flag),
    levels: levels.map(({ level }) => level as number),
    rms: row === undefined ? null : (row.rms as number | null),
  };
}

const loud = (change: (samples: Float64Array) => void, level = 5, length = frames) => {
  const samples = signal(level, 3, length);
  change(samples);
  return samples;
};

describe('samples that are not what they should be', () => {
  it('a rate off by more than 0.1 %: at the rate of the file, a new series, trouble, limits evaluated', async () => {
    const service = await trial(patient);
    await service.hour(0);
    for (const hour of [1, 2]) {
      const { flags, levels } = await measured(service, hour, wav([5], hour, 2600));
      expect(flags).toEqual(['wrong-rate']);
      expect(levels[0]).toBeCloseTo(5, 0);
    }
    expect(await service.standing()).toEqual([
      'overall-fixed-upper pump-2/de-v alert',
      'wrong-rate pump-2/de-v trouble',
    ]);
    expect(await service.rows('series', 'count(distinct fingerprint) as n', 'where point_id = 3')).toEqual([
      { n: 2 },
    ]);
    const back = await measured(service, 3, wav([5], 3, 2561));
    expect(back.flags).toEqual([]);
    expect(await service.standing()).toEqual(['overall-fixed-upper pump-2/de-v alert']);
  });

  it('a rate that nobody configured and that jitters about a rounding: one series all the time', async () => {
    const on = site(patient);
    const file = join(on.folder, 'site.yaml');
    writeFileSync(file, readFileSync(file, 'utf8').replace('  sample_rate: 2560 Hz\n', ''));
    const service = await serviceOn({ ...on, ...siteAt(on.folder) });
    const rates = [16_386, 16_384, 16_386, 16_383, 16_387];
    for (const [hour, rateHz] of rates.entries())
      await measured(service, hour, wav([signal(1, hour, 8192)], hour, rateHz));
    const perSeries = 'select count(*) from levels where levels.series_id = series.id';
    const counts = () => service.rows('series', `(${perSeries}) as n`, 'where point_id = 3 order by id');
    expect(await counts()).toEqual([{ n: 5 }]);
    // More than 0.1 % away it is another rate.
    await measured(service, 6, wav([signal(1, 6, 8192)], 6, 16_420));
    expect(await counts()).toEqual([{ n: 5 }, { n: 1 }]);
  });

  it('NaN and infinite samples: the longest clean stretch is measured, flagged, and can raise', async () => {
    const service = await trial(patient);
    for (const hour of [0, 1]) {
      const { flags, levels } = await measured(
        service,
        hour,
        floats(
          loud((samples) => {
            samples[100] = Number.NaN;
            samples[101] = Number.POSITIVE_INFINITY;
            samples[200] = Number.NEGATIVE_INFINITY;
          }),
        ),
      );
      expect(flags).toEqual(['not-a-number']);
      expect(levels[0]).toBeCloseTo(5, 0);
    }
    expect(await service.standing()).toEqual(['overall-fixed-upper pump-2/de-v alert']);
  });

  it('nothing but NaN: nothing to measure, said so, and nothing of it in the ledger', async () => {
    const service = await trial(patient);
    const { flags, levels, rms } = await measured(
      service,
      0,
      floats(new Float64Array(frames).fill(Number.NaN)),
    );
    expect(flags).toContain('not-a-number');
    expect(levels).toEqual([]);
    expect(rms).toBeNull();
  });

  it('an uneven time column: waveform values only, flagged, trouble', async () => {
    const service = await trial({ ...patient, pump: 'recordings:\n  files: <machine>_<any>.csv' });
    const lines = Array.from(
      signal(5, 3),
      (value, n) => `${(n / sampleRateHz + (n % 7 === 3 ? 0.0002 : 0)).toFixed(7)},${value}`,
    );
    const { flags, levels, rms } = await measured(service, 0, `t [s],1\n${lines.join('\n')}\n`, 'csv');
    expect(flags).toContain('uneven-time');
    expect(levels).toEqual([]);
    expect(rms).toBeCloseTo(5, 0);
    expect(await service.standing()).toContain('uneven-time pump-2/de-v trouble');
  });

  it('clipped: the level is kept as "at least", and raises', async () => {
    const service = await trial(patient);
    for (const hour of [0, 1]) {
      const { flags, levels } = await measured(service, hour, wav([loud(() => {}, 90)]));
      expect(flags.some((flag) => flag === 'clipped' || flag === 'saturated')).toBe(true);
      expect(levels).toHaveLength(1);
    }
    expect(await service.rows('levels', 'distinct at_least')).toEqual([{ at_least: 1 }]);
    expect(await service.standing()).toContain('overall-fixed-upper pump-2/de-v danger');
  });

  it('dropouts: flagged, level kept', async () => {
    const service = await trial(patient);
    const { flags, levels } = await measured(service, 0, wav([loud((samples) => samples.fill(0, 300, 360))]));
    expect(flags).toContain('dropouts');
    expect(levels).toHaveLength(1);
  });

  it('flat, twice: a dead sensor', async () => {
    const service = await trial(patient);
    for (const hour of [0, 1]) {
      const { flags } = await measured(service, hour, wav([new Float64Array(frames).fill(0.5)]));
      expect(flags).toContain('flat');
    }
    expect(await service.standing()).toContain('dead-sensor pump-2/de-v trouble');
    await measured(service, 2, wav([1]));
    expect(await service.standing()).toEqual([]);
  });

  it('flat, saturated or silent: its levels are kept, held against limits, and stay out of the trend', async () => {
    const service = await trial({ ...patient, limit: 'latching: false' });
    for (const hour of [0, 1, 2]) await measured(service, hour, wav([1], hour));
    const flat = (offset: number) =>
      wav([Float64Array.from({ length: frames }, (_, n) => offset + (n % 2) * 1e-9)]);
    expect((await measured(service, 3, flat(0.5))).flags).toEqual(['flat']);
    const stuck = signal(40, 4).map((value) => Math.max(-100, Math.min(99.99, 3 * value + 95)));
    const saturated = await measured(service, 4, wav([stuck], 4));
    expect(saturated.flags).toContain('saturated');
    await measured(service, 5, wav([stuck], 5));
    await measured(service, 6, wav([1.1], 6));
    const levels = await service.rows('levels', 'used_ms, level, in_trend', 'order by used_ms');
    const inTrend = levels.map(({ used_ms, in_trend }) => [
      ((used_ms as number) - beginMs) / hourMs,
      in_trend,
    ]);
    expect(inTrend.filter(([, isIn]) => isIn === 1).map(([hour]) => hour)).toEqual([0, 1, 2, 6]);
    expect(inTrend.filter(([, isIn]) => isIn === 0).map(([hour]) => hour)).toEqual([3, 4, 5]);
    expect(await service.journal()).toContain('raised overall-fixed-upper pump-2/de-v');
  });

  it('digital silence is a flat signal of a dead sensor, not a file that is not all there', async () => {
    const service = await trial(patient);
    for (const hour of [0, 1]) {
      const { flags } = await measured(service, hour, wav([new Float64Array(frames)]));
      expect(flags).toContain('flat');
    }
    expect(await service.standing()).toContain('dead-sensor pump-2/de-v trouble');
  });

  it('too short for one segment: waveform values only, flagged', async () => {
    const service = await trial(patient);
    const { flags, levels, rms } = await measured(service, 0, wav([signal(5, 3, 100)]));
    expect(flags).toContain('too-short');
    expect(levels).toEqual([]);
    expect(rms).toBeCloseTo(5, 0);
  });

  it('a channel that the file has not: said, and the point is in trouble while the other is judged', async () => {
    const service = await trial(patient);
    service.drop(`press-1_${stamp(beginMs)}.wav`, wav([1]));
    service.clock.advance(10_000);
    await service.take();
    expect(await service.standing()).toEqual(['unreadable press-1/nde-h trouble']);
    expect(await service.rows('levels', 'point_id')).toEqual([{ point_id: 1 }]);
  });
});
