/** Recordings in UFF 58, NPY and HDF5 on their whole way, from the drop folder to the ledger. */
import { describe, expect, it } from 'vitest';
import { hdf5Bytes, npyBytes, universalBytes } from '../acquisition/container-writers.ts';
import { beginMs, hourMs, sampleRateHz, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { trial } from './trial.ts';

const anyKind = 'recordings:\n  files: <machine>_<any>';
const inHdf5 = `${anyKind}\n  dataset: /fan\n  sample_rate_attribute: fs`;
const name = (hour: number, ending: string) => `press-1_${stamp(beginMs + hour * hourMs)}.${ending}`;

async function sent(service: TrialService, hour: number, ending: string, bytes: Uint8Array): Promise<void> {
  service.toHour(hour);
  service.drop(name(hour, ending), bytes);
  await service.take();
}

const levels = async (service: TrialService): Promise<number[]> =>
  (await service.rows('levels', 'level', 'order by used_ms, point_id')).map(({ level }) => level as number);

describe.each([
  ['uff', 'text', (both: Float64Array[]) => universalBytes(both, sampleRateHz, 'text')],
  ['uff', 'bytes', (both: Float64Array[]) => universalBytes(both, sampleRateHz, 'bytes')],
  ['npy', 'an array', (both: Float64Array[]) => npyBytes(both)],
  ['h5', 'gzip', (both: Float64Array[]) => hdf5Bytes(both, sampleRateHz)],
] as const)('%s, %s', (ending, _, made) => {
  it('gives both points the levels that the same samples give as WAV, in the same series, and alarms', async () => {
    const service = await trial({ press: ending === 'h5' ? inHdf5 : anyKind });
    const both = [signal(2, 1), signal(5, 2)];
    await sent(service, 0, 'wav', wav(both));
    await sent(service, 1, ending, await made(both));
    expect(await service.outcomes()).toEqual({ [name(0, 'wav')]: 'taken', [name(1, ending)]: 'taken' });
    const [first = 0, second = 0, firstAgain, secondAgain] = await levels(service);
    // 16 bits of a full scale of 100 m/s2 are steps of 0.003.
    expect(firstAgain).toBeCloseTo(first, 3);
    expect(secondAgain).toBeCloseTo(second, 3);
    expect(await service.rows('levels', 'count(distinct series_id) as n')).toEqual([{ n: 2 }]);
    expect(await service.standing()).toEqual(['overall-fixed-upper press-1/nde-h alert']);
  });
});

describe('a damaged HDF5 file', () => {
  it('is quarantined with its reason, and the service goes on', async () => {
    const service = await trial({ press: inHdf5 });
    const whole = await hdf5Bytes([signal(2, 1), signal(2, 2)], sampleRateHz);
    const spoilt = whole.slice().fill(0xee, 100, 900);
    await sent(service, 0, 'h5', spoilt);
    await sent(service, 1, 'h5', whole);
    const outcomes = await service.outcomes();
    expect(outcomes[name(0, 'h5')]).toMatch(/quarantine.*the HDF5 library cannot read it/);
    expect(outcomes[name(1, 'h5')]).toBe('taken');
  });

  it('cut short waits for its rest, and is quarantined when none comes', async () => {
    const service = await trial({ press: inHdf5 });
    const whole = await hdf5Bytes([signal(2, 1), signal(2, 2)], sampleRateHz);
    await sent(service, 0, 'h5', whole.slice(0, 3000));
    expect(await service.outcomes()).toEqual({});
    await service.after(11 * 60_000);
    await service.take();
    expect((await service.outcomes())[name(0, 'h5')]).toMatch(/shorter than its own header says/);
  });
});
