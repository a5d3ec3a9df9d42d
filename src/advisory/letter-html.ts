import type { Severity } from '../config/site.ts';
import type { ZoneLetter } from '../config/zone-tables.ts';
import { html, type Markup } from './escape.ts';
import type { Block, Letter } from './letter.ts';
import { markWord, type Said, saidText } from './letter.ts';
import { pictureId } from './mail-bytes.ts';

/**
 * A letter as HTML: one column, text first, nothing from elsewhere. Styles stand inline, because some mail programs
 * drop style elements; the one style element only turns the paper dark where the reader asked for that, and back for
 * print. The squares are made of borders, which print where backgrounds do not.
 */
const font = "font-family:Georgia,'Times New Roman',serif";
const plainFont = "font-family:Arial,'Liberation Sans',sans-serif";
const monoFont = "font-family:Consolas,'DejaVu Sans Mono',monospace";

const darkAndPrint = `
@media (prefers-color-scheme: dark) {
  .paper { background:#17191c !important; color:#e6e3dc !important }
  .rule { border-color:#5a5f66 !important }
  .soft { color:#b4b1aa !important }
}
@media print {
  .paper { background:#fff !important; color:#000 !important }
  .soft { color:#000 !important }
  .zone { background:none !important; color:#000 !important }
}`;

export function letterHtml(letter: Letter): string {
  const { source } = html`<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="color-scheme" content="light dark">
<meta name="supported-color-schemes" content="light dark">
<title>${letter.head}</title>
<style>:root { color-scheme: light dark }${darkAndPrint}
</style>
</head>
<body class="paper" style="margin:0;padding:0;background:#fff;color:#1a1c1e">
<div class="paper" style="max-width:640px;margin:0 auto;padding:14px;background:#fff;color:#1a1c1e;${font};font-size:16px;line-height:1.4;overflow-wrap:break-word">
${letter.test ? testNotice() : null}<p style="margin:0 0 6px;font-size:19px;line-height:1.3;font-weight:bold">${letter.lead}</p>
<p class="soft" style="margin:0 0 14px;color:#4c5157;font-size:14px">${letter.head}</p>
${letter.blocks.map(blockHtml)}</div>
</body>
</html>
`;
  return source;
}

function testNotice(): Markup {
  return html`<p class="rule" style="margin:0 0 12px;padding:6px 10px;border:2px dashed #1a1c1e"><b>TEST</b>: this is a test message, nothing has happened.</p>
`;
}

function blockHtml(block: Block): Markup {
  switch (block.kind) {
    case 'heading':
      return html`<h2 class="rule" style="margin:16px 0 6px;padding:0 0 1px;border-bottom:1px solid #8b9096;font-size:16px">${block.text}</h2>
`;
    case 'paragraph':
      return html`<p style="margin:0 0 10px">${block.text}</p>
`;
    case 'command':
      return html`<p class="rule" style="margin:0 0 12px;padding:7px 10px;border:1px solid #8b9096;${monoFont};font-size:14px">${block.text}</p>
`;
    case 'closing':
      return html`<p class="soft" style="margin:10px 0 0;color:#4c5157;font-size:13px">${block.text}</p>
`;
    case 'picture':
      return html`<p style="margin:0 0 12px"><img src="cid:${pictureId(block.name)}" alt="${block.alt}" width="${block.size.widthPx}" style="display:block;width:100%;max-width:${block.size.widthPx}px;height:auto;background:#fff"></p>
`;
    case 'finding':
      return findingHtml(block);
    case 'pairs':
      return pairsHtml(block.rows);
    case 'table':
      return tableHtml(block.heads, block.rows);
  }
}

/** The square is drawn with borders alone and takes the colour of the text: outlined, filled, dashed. */
const squareStyle: Readonly<Record<Severity, string>> = {
  alert: 'width:11px;height:11px;border:2px solid',
  danger: 'width:0;height:0;border:7.5px solid',
  trouble: 'width:11px;height:11px;border:2px dashed',
};

function findingHtml(block: Block & { kind: 'finding' }): Markup {
  const number = block.number === null ? '' : ` ${block.number}`;
  const mark =
    block.mark === null
      ? null
      : html`<span style="display:inline-block;${squareStyle[block.mark]};margin-right:6px;vertical-align:-1px"></span><b>${markWord[block.mark]}${number}</b> `;
  const more = block.more.map((line) => html`<br>${line}`);
  const below =
    more.length === 0 ? null : html`<span class="soft" style="color:#4c5157;font-size:15px">${more}</span>`;
  return html`<p style="margin:0 0 9px">${mark}${block.text}${below}</p>
`;
}

function pairsHtml(rows: readonly (readonly [string, Said])[]): Markup {
  return html`<table role="presentation" cellspacing="0" cellpadding="4" style="width:100%;margin:0 0 12px;border-collapse:collapse">
${rows.map(
  ([
    name,
    said,
  ]) => html`<tr><td class="soft" valign="top" style="width:84px;padding-left:0;color:#4c5157">${name}</td><td valign="top">${saidHtml(said)}</td></tr>
`,
)}</table>
`;
}

function tableHtml(heads: readonly string[], rows: readonly (readonly Said[])[]): Markup {
  return html`<table cellspacing="0" cellpadding="4" style="width:100%;margin:0 0 12px;border-collapse:collapse;${plainFont};font-size:12px;line-height:1.35">
<tr>${heads.map((cell) => html`<th class="rule" align="left" valign="bottom" style="border-bottom:1px solid #8b9096">${cell}</th>`)}</tr>
${rows.map(
  (row) => html`<tr>${row.map(cellHtml)}</tr>
`,
)}</table>
`;
}

/** Short figures ('116 %') stay on one line where a phone makes the columns narrow. */
function cellHtml(cell: Said): Markup {
  return saidText(cell).length <= 8
    ? html`<td valign="top" nowrap>${saidHtml(cell)}</td>`
    : html`<td valign="top">${saidHtml(cell)}</td>`;
}

/** One hue in four lightnesses, the letter always on it; a frame, because backgrounds are not printed. */
const zoneColours: Readonly<Record<ZoneLetter, string>> = {
  A: 'background:#eaf0f8;color:#14263d',
  B: 'background:#b9cbe3;color:#14263d',
  C: 'background:#7b9cc8;color:#0d1826',
  D: 'background:#2c4f7f;color:#ffffff',
};

function saidHtml(said: Said): Markup {
  if (typeof said === 'string') return html`${said}`;
  const { before, zone, after } = said;
  return html`${before}<b class="zone" style="padding:0 5px;border:1px solid #2c4f7f;${zoneColours[zone]}">${zone}</b>${after}`;
}
