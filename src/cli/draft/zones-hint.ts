import { rangeAt } from '../../config/machine-zones.ts';
import { parseFrequency } from '../../config/quantity.ts';
import type { DraftMachine } from './plan.ts';
import { line, type YamlLine } from './yaml-lines.ts';

/** The range of every zone table for machines of 600 rpm and more; what a draft does not know is the speed. */
const usualRange = rangeAt(
  { frequency: { fromHz: 10, toHz: 1000, known: 'seen', source: '' }, slow: null },
  600,
);

/**
 * Zones to be filled in and uncommented, where a band of the machine could be judged by them. Power, support and
 * demands stand on its plate and in its papers, never in a file name, so no value is proposed for them.
 */
export function zonesHint(machine: DraftMachine): YamlLine[] {
  const judged = machine.points.some(({ bands }) =>
    bands.some(
      ({ quantity, from, to }) =>
        quantity === 'velocity' && is(from, usualRange.fromHz) && is(to, usualRange.toHz),
    ),
  );
  if (!judged) return [];
  const pump = /pump/i.test(machine.id);
  const open = (key: string, note: string) => line(4, `#   ${key}:`, note);
  return [
    line(4, '# Evaluation zones: what is left open stands on its plate and in its papers.'),
    line(4, '# zones:', 'see README, Zones', true),
    ...(pump
      ? [
          line(4, '#   standard: iso-10816-7', 'rotodynamic pumps', true),
          open('category', 'I: high demands on reliability or safety; II: general'),
          open('power', 'as on its plate'),
        ]
      : [
          line(4, '#   standard: iso-20816-3', 'above 15 kW, no pumps', true),
          open('power', 'as on its plate'),
          open('support', 'rigid or flexible'),
        ]),
    line(4, '# With zones and running_speed, limits need no numbers: write limits: from zones'),
  ];
}

function is(written: string, hz: number): boolean {
  const parsed = parseFrequency(written);
  return parsed.ok && parsed.value === hz;
}
