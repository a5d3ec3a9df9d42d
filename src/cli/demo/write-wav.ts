/**
 * RIFF/WAVE bytes, 16-bit PCM, interleaved (Microsoft/IBM, Multimedia Programming Interface and Data Specifications
 * 1.0, 1991). `channels` hold fractions of full scale; what lies outside -1 to 1 is clipped as a converter clips it.
 */
export function wavBytes(channels: readonly Float64Array[], sampleRateHz: number): Uint8Array {
  const frames = channels[0]?.length ?? 0;
  const blockAlign = 2 * channels.length;
  const dataBytes = frames * blockAlign;
  const bytes = new Uint8Array(44 + dataBytes);
  const view = new DataView(bytes.buffer);
  const ascii = (offset: number, text: string) => {
    for (let i = 0; i < text.length; i++) view.setUint8(offset + i, text.charCodeAt(i));
  };
  ascii(0, 'RIFF');
  view.setUint32(4, 36 + dataBytes, true);
  ascii(8, 'WAVEfmt ');
  view.setUint32(16, 16, true);
  view.setUint16(20, 1, true);
  view.setUint16(22, channels.length, true);
  view.setUint32(24, sampleRateHz, true);
  view.setUint32(28, sampleRateHz * blockAlign, true);
  view.setUint16(32, blockAlign, true);
  view.setUint16(34, 16, true);
  ascii(36, 'data');
  view.setUint32(40, dataBytes, true);
  let offset = 44;
  for (let frame = 0; frame < frames; frame++) {
    for (const channel of channels) {
      const counts = Math.round((channel[frame] as number) * 32768);
      view.setInt16(offset, Math.max(-32768, Math.min(32767, counts)), true);
      offset += 2;
    }
  }
  return bytes;
}
