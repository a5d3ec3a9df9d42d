/** A reload that comes between the reading of a recording and its decision. */
import { readFileSync, writeFileSync } from 'node:fs';
import { expect, it } from 'vitest';
import type { Step } from '../../src/service/steps.ts';
import { signal, wav } from './site-on-disk.ts';
import { serviceOn, site } from './trial.ts';

it('a recording is decided on by the site file in force, also where that changes just before', async () => {
  const on = site();
  const text = readFileSync(`${on.folder}/site.yaml`, 'utf8');
  let reloaded: Promise<unknown> | null = null;
  const step: Step = (name) => {
    // Asked for just before the decision is: it comes first in the ledger.
    if (name === 'intake: decision begun') reloaded ??= service.service.reload();
  };
  const service = await serviceOn(on, { step });
  writeFileSync(`${on.folder}/site.yaml`, text.replaceAll('pump-2', 'pump-3').replaceAll('Pump 2', 'Pump 3'));
  service.drop('pump-2_20260302T060000Z.wav', wav([signal(1, 1)]));
  await service.take();
  expect(await reloaded).toBe(null);
  expect(await service.rows('recordings', 'file_name')).toEqual([]);
  expect(service.files('drop')).toEqual(['pump-2_20260302T060000Z.wav']);
  await service.take();
  expect(service.files('drop')).toEqual(['pump-2_20260302T060000Z.wav']);
  expect(await service.rows('recordings', 'file_name')).toEqual([]);
});
