import { statfsSync } from 'node:fs';

/**
 * File systems on which SQLite's locks and shared memory cannot be trusted, by the type that statfs(2) reports
 * (numbers from linux/magic.h and the file systems' own sources). Not here: FUSE, which is as often a local disk, and 9p,
 * through which containers see their host's local disk.
 */
export const networkFileSystems: readonly (readonly [type: number, name: string])[] = [
  [0x6969, 'NFS'],
  [0x517b, 'SMB'],
  [0xff534d42, 'CIFS'],
  [0xfe534d42, 'SMB'],
  [0x564c, 'NCP'],
  [0x5346414f, 'AFS'],
  [0x6b414653, 'AFS'],
  [0x73757245, 'Coda'],
  [0x00c36400, 'Ceph'],
  [0x0bd00bd0, 'Lustre'],
  [0x47504653, 'GPFS'],
  [0x01161970, 'GFS2'],
  [0x7461636f, 'OCFS2'],
];

export function fileSystemType(folder: string): number {
  // Some systems hand the type on as a negative 32-bit number.
  return statfsSync(folder).type >>> 0;
}

/** Name of the network file system of that type; null for a local one. */
export function networkShareName(type: number): string | null {
  return networkFileSystems.find(([known]) => known === type)?.[1] ?? null;
}
