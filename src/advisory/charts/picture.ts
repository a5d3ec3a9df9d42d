import type { ChartSize } from './chart-style.ts';
import type { ChartOption } from './chart-svg.ts';

/** A chart that a message carries; drawn when it leaves. */
export interface Picture {
  /** Of letters, digits and '-'; unique within its message. */
  readonly name: string;
  readonly option: ChartOption;
  readonly size: ChartSize;
}
