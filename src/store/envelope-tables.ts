export interface EnvelopesTable {
  measurement_id: number;
  from_hz: number;
  to_hz: number;
  /** fixed | kurtosis */
  chosen: string;
  line_spacing_hz: number;
  segment_samples: number;
  averages: number;
  effective_averages: number;
  used_percent: number;
}

/** Thinned together with the plain spectrum of its measurement. */
export interface EnvelopeSpectraTable {
  measurement_id: number;
  line_spacing_hz: number;
  /** Float32, little-endian, one-sided density in (SI unit)²/Hz up to half the width of the demodulated band. */
  density: Uint8Array;
}

export interface EnvelopeChoicesTable {
  point_id: number;
  /** JSON. */
  choice: string;
}
