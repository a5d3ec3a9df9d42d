import { frequency } from './schema-values.ts';
import { choice } from './shape.ts';
import { key, map } from './shape-map.ts';

export const envelopeKeys = {
  from: key(frequency(1, 5_000_000, '2 kHz'), 'Lower edge of the band that is demodulated.', {
    fallback: '2 kHz, lower where the sample rate or the mounting is low',
  }),
  to: key(frequency(1, 5_000_000, '8 kHz'), 'Upper edge of the band that is demodulated.', {
    fallback: '8 kHz, at most sample rate / 2.56 and the range of the mounting',
  }),
  choose: key(
    choice(['by kurtosis']),
    'by kurtosis: the band in which short shocks stand out, once five recordings agree on one; until then from and to hold.',
    { fallback: 'from and to hold' },
  ),
};

export const envelope = map(envelopeKeys);
