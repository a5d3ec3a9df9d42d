import { type Parsed, parsePhysical, refused, shorten, understood } from './quantity.ts';
import { choice, scalar } from './shape.ts';
import { key } from './shape-map.ts';
import { zoneStandards } from './zone-tables.ts';

function parsePower(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['power'], 'kW');
  if (!parsed.ok) return parsed;
  return parsed.value.value > 0
    ? understood(parsed.value.value)
    : refused(`'${shorten(text)}' is not above 0`);
}

function parseHeight(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['displacement'], 'mm');
  if (!parsed.ok) return parsed;
  return parsed.value.value > 0 && parsed.value.value <= 10
    ? understood(parsed.value.value)
    : refused(`'${shorten(text)}' is not above 0 and up to 10000 mm`);
}

/** Which evaluation zones hold for a machine. */
export const zoneKeys = {
  standard: key(
    choice(zoneStandards),
    'iso-20816-3 (or its forerunner iso-10816-3) with support, and power or shaft_height; iso-10816-7 (pumps) with category and power; iso-10816-1 with class.',
    {
      required: true,
    },
  ),
  power: key(scalar(parsePower, { example: '110 kW' }), 'Rated power of the machine.'),
  shaft_height: key(
    scalar(parseHeight, { example: '280 mm' }),
    'iso-20816-3, electrical machines only: from the feet to the middle of the shaft; counts before the power.',
  ),
  support: key(
    choice(['rigid', 'flexible']),
    'Rigid: the lowest natural frequency on its support is at least 25 % above the running frequency.',
  ),
  category: key(choice(['I', 'II']), 'iso-10816-7: I high demands on reliability or safety, II general.'),
  class: key(choice(['I', 'II', 'III', 'IV']), 'iso-10816-1, Annex B.'),
};

export const sensorPlaces = ['bearing-housing', 'shaft', 'elsewhere'] as const;
