import { onTestFinished } from 'vitest';
import { makeSite, type SiteChanges, type SiteOnDisk, TrialService } from './site-on-disk.ts';

type Options = Parameters<typeof TrialService.start>[1];

/** A site that is gone when the test is over. */
export function site(changes: SiteChanges = {}, dataFolder?: string): SiteOnDisk {
  const made = makeSite(changes, dataFolder);
  onTestFinished(() => made.remove());
  return made;
}

/** The service on a site, stopped when the test is over. */
export async function serviceOn(on: SiteOnDisk, options: Options = {}): Promise<TrialService> {
  const service = await TrialService.start(on, options);
  onTestFinished(() => service.stop());
  return service;
}

export function trial(changes: SiteChanges = {}, options: Options = {}): Promise<TrialService> {
  return serviceOn(site(changes), options);
}
