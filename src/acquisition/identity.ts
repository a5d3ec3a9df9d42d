import { createHash } from 'node:crypto';

export interface RecordingIdentity {
  /** SHA-256 of the whole file, in hexadecimal. */
  readonly contentSha256: string;
  /** Of its sidecar; null without one. */
  readonly sidecarSha256: string | null;
  readonly source: string;
  readonly statedMs: number | null;
  /** Used only where no start is stated: then a name and a time of change are all that tells two files apart. */
  readonly path: string;
  readonly modifiedMs: number;
}

/**
 * What makes two files the same recording: content, sidecar, source and stated start, as one hash in hexadecimal.
 * Equal content with another stated start is a recording of its own (a test signal repeats itself).
 */
export function recordingIdentity(identity: RecordingIdentity): string {
  const { contentSha256, sidecarSha256, source, statedMs } = identity;
  const when = statedMs === null ? ['not stated', identity.path, identity.modifiedMs] : ['stated', statedMs];
  // JSON keeps the parts apart whatever letters they hold.
  return createHash('sha256')
    .update(JSON.stringify([contentSha256, sidecarSha256, source, ...when]))
    .digest('hex');
}
