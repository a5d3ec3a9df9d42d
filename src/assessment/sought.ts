import type { Part } from '../config/parts.ts';
import type { ObservedSpeed } from './evidence.ts';
import type { Picture, PicturePlace, Shown } from './pictures.ts';
import type { SearchedSpectrum } from './standing-lines.ts';

/** A spectrum, the speed that it shows, and all parts of the machine: where pictures are looked for. */
export interface Looked {
  readonly spectrum: SearchedSpectrum;
  readonly speed: ObservedSpeed;
  readonly partsOfMachine: readonly Part[];
}

/** A picture of a part that is looked for, and how it is told. */
export interface Sought {
  readonly part: Part;
  /** What would be damaged; of an observation what it is of. */
  readonly fault: string;
  readonly frequency: string;
  /** Sound machines may show it as well: it is told, and names no fault. */
  readonly isObservation: boolean;
  readonly picture: Picture;
  readonly expectedHz: number;
  readonly observedHz: (shown: Shown) => number;
  readonly words: (shown: Shown) => string;
  /** Of a line of the picture, without its part. */
  readonly nameOf: (place: PicturePlace) => string;
}

/** A picture that these lines cannot tell from something else that stands there. */
export interface Untold {
  readonly part: Part;
  readonly fault: string;
  readonly frequency: string;
  readonly expectedHz: number;
  /** 0: no line spacing would. */
  readonly neededHz: number;
  readonly words: string;
}

export interface PartSearch {
  readonly sought: readonly Sought[];
  readonly untold: readonly Untold[];
}

export const nothingSought: PartSearch = { sought: [], untold: [] };
