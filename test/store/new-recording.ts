import type { NewRecording } from '../../src/store/recordings.ts';

export function recordingOf(more: Partial<NewRecording> = {}): NewRecording {
  return {
    identity: 'identity-1',
    sourceId: null,
    contentSha256: 'content-1',
    sidecarSha256: null,
    statedMs: 1000,
    startOrigin: 'file-name',
    arrivedMs: 2000,
    usedMs: 1000,
    fileName: 'pump_20261201T060000Z.wav',
    sizeBytes: 4096,
    durationS: 10,
    sampleRateHz: 25600,
    channelCount: 1,
    configVersionId: 1,
    outcome: 'taken',
    reason: null,
    evaluated: true,
    quality: [],
    filingFrom: 'pump_20261201T060000Z.wav',
    filingTo: 'archive/2026/12/01/pump_20261201T060000Z.wav',
    filingState: 'pending',
    ...more,
  };
}
