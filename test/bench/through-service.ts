import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { SteppedClock } from '../../src/service/clock.ts';
import { noLog } from '../../src/service/log.ts';
import { Service } from '../../src/service/service.ts';
import { makeSite, recordingName } from './bench-site.ts';

export interface ServiceSpeed {
  readonly threads: number;
  /** Whether a rolling bearing is heard, so that an envelope is made and evidence looked for. */
  readonly evidence: boolean;
  readonly recordings: number;
  readonly wallMs: number;
  /** Of all threads. */
  readonly cpuMs: number;
  /** From the begin of a decision to its commit on the disk, each. */
  readonly decisionMs: number;
  /** Of the rest of the round, after the last decision: files moved away, and that noted. */
  readonly filingMs: number;
  readonly residentBytes: number;
}

/** Recordings of the first round: threads, plans and statements are made and the code is warm after them. */
const warmUp = 16;
const minuteMs = 60_000;

/** Real files through the real service: settled, read by worker threads, decided on and committed, archived. */
export async function throughService(
  threads: number,
  recordings: number,
  bytes: readonly Uint8Array[],
  evidence = false,
): Promise<ServiceSpeed> {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-bench-'));
  const beginMs = Date.UTC(2026, 2, 2);
  const clock = new SteppedClock(beginMs);
  const siteFile = makeSite(folder, evidence);
  const decisions = new Stopwatch();
  let lastDecisionMs = 0;
  let lastFilingMs = 0;
  const service = await Service.start({
    siteFile,
    clock,
    log: noLog,
    threads,
    step: (name) => {
      if (name === 'intake: decision begun') decisions.begin();
      if (name === 'intake: decision committed') lastDecisionMs = decisions.end();
      if (name === 'intake: filing committed') lastFilingMs = performance.now();
    },
  });
  if ('refused' in service) throw new Error(service.refused);
  let dropped = 0;
  const round = async (files: number): Promise<void> => {
    for (let n = 0; n < files; n++, dropped++) {
      const name = recordingName(beginMs + dropped * minuteMs);
      writeFileSync(join(siteFile.site.folders.drop, name), bytes[dropped % bytes.length]);
    }
    clock.advance(files * minuteMs);
    await service.intakeRound(false);
    clock.advance(6_000);
  };
  try {
    await round(warmUp);
    await service.intakeRound(false);
    await round(recordings);
    decisions.reset();
    const cpu = process.cpuUsage();
    const beganMs = performance.now();
    const { taken, waiting } = await service.intakeRound(false);
    const wallMs = performance.now() - beganMs;
    const { user, system } = process.cpuUsage(cpu);
    if (taken !== recordings || waiting !== 0)
      throw new Error(`${taken} of ${recordings} recordings were taken`);
    return {
      threads,
      evidence,
      recordings,
      wallMs,
      cpuMs: (user + system) / 1000,
      decisionMs: decisions.totalMs / recordings,
      filingMs: (lastFilingMs - lastDecisionMs) / recordings,
      residentBytes: process.memoryUsage().rss,
    };
  } finally {
    await service.stop();
    rmSync(folder, { recursive: true });
  }
}

class Stopwatch {
  totalMs = 0;
  #beganMs = 0;

  begin(): void {
    this.#beganMs = performance.now();
  }

  /** The time now. */
  end(): number {
    const nowMs = performance.now();
    this.totalMs += nowMs - this.#beganMs;
    return nowMs;
  }

  reset(): void {
    this.totalMs = 0;
  }
}
