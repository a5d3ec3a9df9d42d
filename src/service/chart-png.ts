import { fileURLToPath } from 'node:url';
import { Resvg } from '@resvg/resvg-js';

/** Charts for mail as PNG: mail programs show no SVG, and a server has no fonts, so the shipped ones are used. */
const fontFiles = [
  import.meta.resolve('dejavu-fonts-ttf/ttf/DejaVuSans.ttf'),
  import.meta.resolve('dejavu-fonts-ttf/ttf/DejaVuSans-Bold.ttf'),
].map((url) => fileURLToPath(url));

/** `scale` 2 for screens with fine dots: the picture has twice as many, and is shown at its own size. */
export function chartPng(svg: string, scale = 2): Uint8Array {
  const picture = new Resvg(svg, {
    font: { fontFiles, loadSystemFonts: false, defaultFontFamily: 'DejaVu Sans' },
    fitTo: { mode: 'zoom', value: scale },
  });
  return picture.render().asPng();
}
