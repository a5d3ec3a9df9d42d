import { describe, expect, it } from 'vitest';
import { reachOf, recipientsAt, recipientsFor } from '../../src/advisory/recipients.ts';
import { parseHours } from '../../src/config/hours.ts';
import type { Machine, Recipient } from '../../src/config/site.ts';

const all: Recipient = { address: 'ann@x', machines: null, areas: null, severities: null };
const machine = { id: 'fan', area: 'aeration' } as Machine;
const only = (text: string): Pick<Recipient, 'hours'> => {
  const parsed = parseHours(text);
  if (!parsed.ok) throw new Error(parsed.what);
  return { hours: parsed.value };
};
/** Tue 1 Dec 2026, Dublin. */
const reach = (list: readonly Recipient[], hour: number, severity: 'alert' | 'danger' | 'trouble') =>
  reachOf(
    recipientsAt(list, { ms: Date.UTC(2026, 11, 1, hour), timeZone: 'Europe/Dublin' }),
    machine,
    severity,
  );

describe('recipients', () => {
  it('are those whom machine, area and severity concern, each once; what is of no machine concerns all', () => {
    const list: Recipient[] = [
      all,
      { ...all, address: 'ben@x', machines: ['pump'] },
      { ...all, address: 'cat@x', areas: ['aeration'] },
      { ...all, address: 'dan@x', areas: ['sludge'] },
      { ...all, address: 'eve@x', severities: ['danger'] },
      { ...all, severities: ['alert'] },
    ];
    expect(recipientsFor(list, machine, 'alert')).toEqual(['ann@x', 'cat@x']);
    expect(recipientsFor(list, machine, 'danger')).toEqual(['ann@x', 'cat@x', 'eve@x']);
    expect(recipientsFor(list, null, 'trouble')).toEqual(['ann@x', 'ben@x', 'cat@x', 'dan@x']);
    expect(recipientsFor(list, { ...machine, area: null }, 'alert')).toEqual(['ann@x']);
  });

  const shifts: Recipient[] = [
    { ...all, address: 'day@x', ...only('06:00..18:00') },
    { ...all, address: 'late@x', severities: ['danger'], ...only('18:00..22:00') },
    { ...all, address: 'day@x', machines: ['fan'], severities: ['alert'], ...only('20:00..21:00') },
  ];

  it('are those whose hours fit; entries of one address add up', () => {
    expect(reach(shifts, 7, 'danger').addresses).toEqual(['day@x']);
    expect(reach(shifts, 19, 'danger').addresses).toEqual(['late@x']);
    expect(reach(shifts, 20, 'alert').addresses).toEqual(['day@x']);
  });

  it('where nobody has the hour: an alert waits for the first that fits, a danger goes to all', () => {
    expect(reach(shifts, 19, 'alert')).toEqual({ addresses: [], waitsUntilMs: Date.UTC(2026, 11, 1, 20) });
    expect(reach(shifts, 23, 'trouble')).toEqual({ addresses: [], waitsUntilMs: Date.UTC(2026, 11, 2, 6) });
    expect(reach(shifts, 23, 'danger')).toEqual({ addresses: ['day@x', 'late@x'], waitsUntilMs: null });
  });

  it('what nobody takes at any hour waits for nobody', () => {
    expect(reach([{ ...all, machines: ['pump'] }], 12, 'danger')).toEqual({
      addresses: [],
      waitsUntilMs: null,
    });
  });
});
