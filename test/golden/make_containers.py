"""Writes the sample recordings in UFF 58, NPY and HDF5 under test/files/recordings, and beside this script
containers.json: what each of them holds, as numpy has it. Needs numpy and h5py, which the tests do not.

The UFF writer here follows the Fortran formats of data set 58 (University of Cincinnati SDRL) and shares nothing with
the program's reader; .npy files are written by numpy, HDF5 files by h5py.
"""

import json
import os
import struct

import h5py
import numpy as np

HERE = os.path.dirname(os.path.abspath(__file__))
FILES = os.path.join(HERE, '..', 'files', 'recordings')
held = {}


def path(name):
    return os.path.join(FILES, name)


def keep(name, channels, rate=None, layout=None):
    """channels: values as the reader gives them, integers as fractions of full scale."""
    held[name] = {
        'rate': rate,
        'layout': layout or {},
        'channels': [
            {'frames': len(c), 'sum': float(np.sum(c)), 'sumOfSquares': float(np.sum(np.square(c))),
             'first': float(c[0]), 'last': float(c[-1])}
            for c in (np.asarray(c, dtype='f8') for c in channels)
        ],
    }


def tone(n, k=0):
    i = np.arange(n)
    return np.sin(i / (3 + k)) + 0.1 * np.sin(1.7 * i)


def columns(n, count):
    return np.stack([tone(n, k) for k in range(count)], axis=1)


# ---- NPY ----------------------------------------------------------------------------------------------------------
def npy():
    a = columns(1100, 2).astype('<f4')
    np.save(path('two-columns.npy'), a)
    keep('two-columns.npy', a.T)

    a = np.round(columns(1100, 2) * 20000).astype('<i2').T.copy()
    np.save(path('two-rows.npy'), a)
    keep('two-rows.npy', a / 2**15)

    a = np.asfortranarray(np.round(columns(1100, 2) * 20000).astype('>i2'))
    np.save(path('fortran-columns.npy'), a)
    keep('fortran-columns.npy', a.T / 2**15)

    a = np.asfortranarray(np.round(columns(1100, 2) * 90).astype('i1').T)
    np.save(path('fortran-rows.npy'), a)
    keep('fortran-rows.npy', a / 2**7)

    a = tone(200).astype('>f8')
    with open(path('second-version.npy'), 'wb') as f:
        np.lib.format.write_array(f, a, version=(2, 0))
    keep('second-version.npy', [a])

    a = np.round(128 + 100 * tone(300)).astype('u1')
    with open(path('third-version.npy'), 'wb') as f:
        np.lib.format.write_array(f, a, version=(3, 0))
    keep('third-version.npy', [(a.astype('f8') - 128) / 128])

    a = np.round(tone(60) * 2**60).astype('>i8')
    np.save(path('wide-integers.npy'), a)
    keep('wide-integers.npy', [a.astype('f8') / 2**63])

    a = np.round((tone(60) + 1.2) * 2**29).astype('<u4')
    np.save(path('unsigned.npy'), a)
    keep('unsigned.npy', [(a.astype('f8') - 2**31) / 2**31])

    a = columns(40, 3).astype('<f4')
    np.save(path('either-way.npy'), a)
    keep('either-way.npy', a.T, layout={'channelsIn': 'columns'})
    np.save(path('objects.npy'), np.array([1, 'two'], dtype=object), allow_pickle=True)
    np.save(path('complex.npy'), np.exp(1j * np.arange(20)))
    np.save(path('three-dimensions.npy'), np.zeros((2, 3, 4), 'f4'))
    fields = np.zeros(4, dtype=[('t', '<f8'), ('x', '<f4')])
    np.save(path('fields.npy'), fields)
    whole = open(path('two-columns.npy'), 'rb').read()
    open(path('cut-short.npy'), 'wb').write(whole[:5001])
    a = np.frombuffer(whole[128:5001][: (5001 - 128) // 8 * 8], '<f4').reshape(-1, 2)
    keep('cut-short.npy', a.T)


# ---- UFF 58 -------------------------------------------------------------------------------------------------------
def e13(v):
    return f'{v:13.5E}'


def e20(v):
    return f'{v:20.12E}'


def data_set(values, interval, *, ids=None, function=1, ordinate=4, spacing=1, node=1, direction=3, entity='NONE',
             unit='m/s2', form='text', order=1, end='\n', abscissa=17, written=e20):
    ids = ids or ['NONE', 'NONE', '01-MAY-24 12:00:00', 'NONE', 'NONE']
    number = len(values) if ordinate < 5 else len(values) // 2
    dtype = ('<' if order == 1 else '>') + ('f4' if ordinate in (2, 5) else 'f8')
    raw = np.asarray(values, dtype).tobytes()
    lines = ['    -1']
    if form == 'text':
        lines.append('    58')
    else:
        lines.append(f'{58:6d}b{order:6d}{2:6d}{11:12d}{len(raw):12d}{0:6d}{0:6d}{0:12d}{0:12d}')
    lines += ids
    lines.append(f'{function:5d}{0:10d}{0:5d}{0:10d} {entity:<10s}{node:10d}{direction:4d} {"NONE":<10s}{0:10d}{0:4d}')
    lines.append(f'{ordinate:10d}{number:10d}{spacing:10d}{e13(0)}{e13(interval)}{e13(0)}')
    lines.append(f'{abscissa:10d}{0:5d}{0:5d}{0:5d} {"Time":<20s} {"s":<20s}')
    lines.append(f'{12:10d}{1:5d}{0:5d}{0:5d} {"Acceleration":<20s} {unit:<20s}')
    lines += [f'{0:10d}{0:5d}{0:5d}{0:5d} {"NONE":<20s} {"NONE":<20s}'] * 2
    head = end.join(lines) + end
    if form != 'text':
        return head.encode('latin1') + raw + ('    -1' + end).encode()
    across = 6 if ordinate in (2, 5) else 4
    text = ''.join(
        ''.join(written(v) for v in values[at:at + across]) + end for at in range(0, len(values), across))
    return (head + text + '    -1' + end).encode('latin1')


UNITS = (b'    -1\n   164\n         1  SI: Newton, m           2\n'
         b'    1.00000000000000000E+00  1.00000000000000000E+00  1.00000000000000000E+00\n'
         b'    2.73149999999999977E+02\n    -1\n')


def uff():
    def put(name, *parts):
        open(path(name), 'wb').write(b''.join(parts))

    s = np.round(tone(101), 12)
    put('one-response.uff', data_set(s, 1 / 25600))
    keep('one-response.uff', [s], rate=25600)

    a, b = (np.round(tone(100, k), 5) for k in (0, 1))
    single = lambda v: float(f'{v:13.5E}')
    a, b = [[single(v) for v in c] for c in (a, b)]
    put('two-responses.unv', UNITS,
        data_set(a, 1 / 2560, ordinate=2, written=e13, entity='DE', node=3, direction=-1, end='\r\n'),
        data_set(np.ones(8), 1, function=12, abscissa=18),
        data_set(b, 1 / 2560, ordinate=2, written=e13, entity='DE', node=3, direction=2))
    keep('two-responses.unv', [a, b], rate=2560)

    put('bytes.uff', data_set(a, 1 / 5120, ordinate=2, form='bytes', node=1), UNITS,
        data_set(b, 1 / 5120, ordinate=4, form='bytes', order=2, node=2))
    keep('bytes.uff', [np.asarray(a, 'f4'), b], rate=5120)

    exponents = lambda v: e20(v).replace('E', 'D')
    put('d-exponents.uff', data_set(s, 1 / 25600, written=exponents, ids=['left', 'NONE', 'no date', 'NONE', 'NONE'], node=0,
                                    direction=0), data_set(s, 1 / 25600, ids=['right', '', 'no date', '', ''], node=0,
                                                           direction=0, function=0))
    keep('d-exponents.uff', [s, s], rate=25600)

    touching = lambda v: f'{v:13.6E}'[-13:]
    deep = -np.abs([1 + v / 7 for v in a])
    put('touching-columns.uff', data_set(deep, 1 / 2560, ordinate=2, written=touching))
    keep('touching-columns.uff', [[float(touching(v)) for v in deep]], rate=2560)

    whole = data_set(s, 1 / 25600)
    put('text-cut.uff', whole[:2000])
    lines = whole[:2000].split(b'\n')[13:-1]
    there = [float(line[20 * k:20 * k + 20]) for line in lines for k in range(len(line) // 20)]
    keep('text-cut.uff', [there], rate=25600)
    put('complex.uff', data_set(s[:100], 1 / 25600, ordinate=6))
    put('uneven.uff', data_set(s[:100], 0, spacing=0))
    put('spectrum-only.uff', data_set(s[:20], 1, function=12, abscissa=18))
    put('different-lengths.uff', data_set(s, 1 / 25600), data_set(s[:50], 1 / 25600, node=2))
    put('different-rates.uff', data_set(s, 1 / 25600), data_set(s, 1 / 12800, node=2))
    rows = whole.split(b'\n')
    put('line-lost.uff', b'\n'.join(rows[:20] + rows[21:]))
    short = data_set(a, 1 / 5120, ordinate=2, form='bytes')
    put('bytes-lost.uff', short[:-40] + short[-37:] + UNITS)
    put('wrong-size.uff', short.replace(f'{400:12d}'.encode(), f'{800:12d}'.encode(), 1))
    put('no-ieee.uff', short.replace(b'     1     2', b'     1     1', 1))
    put('word-in-the-middle.uff', whole.replace(whole[1000:1020], b'             missing', 1))


# ---- HDF5 ---------------------------------------------------------------------------------------------------------
def hdf5():
    a = columns(1100, 2).astype('<f4')
    with h5py.File(path('one-data-set.h5'), 'w') as f:
        d = f.create_dataset('vibration/acceleration', data=a)
        d.attrs['units'] = 'm/s2'
        f['vibration'].attrs['sample_rate'] = 25600.0
    keep('one-data-set.h5', a.T, rate=25600, layout={'sampleRateAttribute': 'sample_rate'})

    s = [np.round(tone(700, k) * 20000).astype('>i2') for k in range(3)]
    with h5py.File(path('channels-of-a-group.h5'), 'w', libver='latest') as f:
        g = f.create_group('fan')
        for k, name in enumerate(['de-h', 'de-v', 'nde-h']):
            d = g.create_dataset(name, data=s[k], chunks=(128,), compression='gzip', shuffle=True, fletcher32=True)
            d.attrs['fs'] = np.int32(12800)
            d.attrs.create('unit', np.bytes_('V'))
        f.create_dataset('notes', data=np.arange(4))
    keep('channels-of-a-group.h5', [c / 2**15 for c in s], rate=12800,
         layout={'dataset': '/fan', 'sampleRateAttribute': 'fs'})

    a = columns(500, 3).T.astype('>f8')
    with h5py.File(path('rows-in-chunks.h5'), 'w', userblock_size=512) as f:
        f.create_dataset('x', data=a, chunks=(2, 70), compression='gzip', maxshape=(3, None))
    keep('rows-in-chunks.h5', a, layout={'channelsIn': 'rows'})

    a = np.round(tone(400) * 100).astype('u1')
    with h5py.File(path('scale-and-offset.hdf5'), 'w') as f:
        f.create_dataset('x', data=(a.astype('i4') * 3), chunks=(50,), scaleoffset=0)
    keep('scale-and-offset.hdf5', [a.astype('f8') * 3 / 2**31])

    with h5py.File(path('packed-by-others.h5'), 'w') as f:
        f.create_dataset('x', data=tone(100), chunks=(50,), compression='lzf')
    with h5py.File(path('words-only.h5'), 'w') as f:
        f.create_dataset('x', data=['a', 'b'])
    with h5py.File(path('elsewhere.h5'), 'w') as f:
        f['x'] = h5py.ExternalLink('one-data-set.h5', '/vibration/acceleration')
        f.create_dataset('y', shape=(40,), dtype='f8', external=[('/etc/hostname', 0, 320)])
    # Nothing is written into either, so that both are small.
    with h5py.File(path('long-chunks.h5'), 'w') as f:
        f.create_dataset('x', shape=(8_000_000,), dtype='f8', chunks=(5_000_000,), compression='gzip')
    with h5py.File(path('promises-much.h5'), 'w') as f:
        f.create_dataset('x', shape=(10**12,), dtype='f8', chunks=(1000,), compression='gzip')
    whole = open(path('one-data-set.h5'), 'rb').read()
    open(path('cut-short.h5'), 'wb').write(whole[:3000])


if __name__ == '__main__':
    npy()
    uff()
    hdf5()
    with open(os.path.join(HERE, 'containers.json'), 'w') as f:
        json.dump(held, f, indent=1)
        f.write('\n')
