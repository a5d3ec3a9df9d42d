/**
 * The look of every chart: dark lines on white, one blue for what was measured, shapes and words beside every colour,
 * so that a page from a black and white printer says the same. Font: DejaVu Sans, which is shipped (a server has none).
 */
export const ink = {
  text: '#1d2126',
  soft: '#5b6169',
  grid: '#d9dce0',
  measured: '#1f4e79',
  interval: '#c4d6e8',
  before: '#8a9199',
  alert: '#7a4b00',
  danger: '#8c1515',
  note: '#3c3f44',
  paper: '#ffffff',
} as const;

export const fontFamily = "'DejaVu Sans', sans-serif";

export interface ChartSize {
  readonly widthPx: number;
  readonly heightPx: number;
}

/** Text grows a little on wide charts; below 500 px it is what a phone still reads. */
export function textPx({ widthPx }: ChartSize): number {
  return widthPx < 500 ? 11 : 12;
}

export function textStyle(size: ChartSize, color: string = ink.text) {
  return { fontFamily, fontSize: textPx(size), color };
}

/** Axis that is drawn, labelled in dark ink, and named with its unit. */
export function axisStyle(size: ChartSize) {
  return {
    axisLine: { show: true, lineStyle: { color: ink.text, width: 1 } },
    axisTick: { show: true, lineStyle: { color: ink.text } },
    axisLabel: { ...textStyle(size), hideOverlap: true },
    nameTextStyle: textStyle(size, ink.soft),
    splitLine: { show: true, lineStyle: { color: ink.grid, width: 1 } },
  };
}
