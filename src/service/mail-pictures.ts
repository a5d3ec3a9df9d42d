import { chartSvg } from '../advisory/charts/chart-svg.ts';
import type { Mail } from '../advisory/facts.ts';
import type { MailPicture } from '../advisory/mail-bytes.ts';
import { chartPng } from './chart-png.ts';

/** Dots to each of the picture's own: sharp on a phone, and small enough that a mail stays below 300 kB. */
const scale = 1.5;

/**
 * The pictures of a mail as PNG. One that cannot be drawn is left out and `undrawn` is told: what it shows stands in the
 * words as well, and no alert waits for a picture.
 */
export function mailPictures(
  { pictures = [] }: Mail,
  undrawn: (name: string, reason: string) => void,
): MailPicture[] {
  return pictures.flatMap(({ name, option, size }) => {
    try {
      return [{ name, png: chartPng(chartSvg(option, size), scale) }];
    } catch (error) {
      undrawn(name, error instanceof Error ? error.message : String(error));
      return [];
    }
  });
}
