import { siteFiles } from '../../acquisition/file-pattern.ts';
import { nothingSaid } from '../../config/sample-layout.ts';
import { type Machine, type Point, pointPath, type Site } from '../../config/site.ts';
import { usualSpeed } from '../../config/speed-settings.ts';
import { chosenBand, type EnvelopeChoice } from '../../manipulation/envelope-choice.ts';
import { analyseFile, type FileAnalysis } from '../../service/analyse-file.ts';

/** Files that are analysed for want of a ledger; each takes up to a second or two. */
const mostFiles = 200;

export type FileAnswer = FileAnalysis | { readonly reason: string };

/** Analyses recordings on the spot, each file once for all its points, in the way in which the service measures them. */
export class FileLevels {
  readonly #site: Site;
  readonly #choiceOf: (point: Point) => EnvelopeChoice | null;
  readonly #machines: ReadonlyMap<string, Machine>;
  readonly #takes: (path: string) => readonly Point[];
  readonly #done = new Map<string, FileAnswer>();

  /** `choiceOf`: what recordings of a point have agreed on. */
  constructor(site: Site, choiceOf: (point: Point) => EnvelopeChoice | null = () => null) {
    this.#site = site;
    this.#choiceOf = choiceOf;
    this.#machines = new Map(site.machines.map((machine) => [machine.id, machine]));
    this.#takes = siteFiles(site).pointsFor;
  }

  /** `path` is absolute; `asDropped` how it was called in the drop folder, which says whose it is. */
  async analyse(path: string, asDropped: string, point: Point): Promise<FileAnswer> {
    const known = this.#done.get(path);
    if (known !== undefined) return known;
    if (this.#done.size >= mostFiles)
      return { reason: `not analysed: more than ${mostFiles} files would have to be` };
    const taking = this.#takes(asDropped);
    const points = taking.some((one) => pointPath(one) === pointPath(point)) ? taking : [point];
    const answer = await analyseFile(path, this.#site.largestFileBytes, {
      layout: points[0]?.recordings.layout ?? nothingSaid,
      planFor: (header, sidecar) => ({
        points: points.map((one) => ({
          point: one,
          nominalHz: this.#machines.get(one.machineId)?.runningSpeedHz ?? null,
          speed: this.#machines.get(one.machineId)?.speed ?? usualSpeed,
          parts: this.#machines.get(one.machineId)?.parts,
          chosenBand: chosenBand(
            this.#choiceOf(one),
            one,
            header.sampleRateHz ?? one.recordings.sampleRateHz,
          ),
        })),
        sidecar,
        clock: point.recordings.clock,
        siteZone: this.#site.timeZone,
        startInName: point.recordings.startInName,
      }),
    });
    this.#done.set(path, answer);
    return answer;
  }
}
