/**
 * The rules by which a recording's samples and spectrum are flagged, with their thresholds. A step q is the smallest
 * difference between neighbouring samples that the channel shows: its resolution.
 *
 * | flag | said when |
 * |---|---|
 * | not-a-number | a sample is NaN or infinite |
 * | flat | all samples are equal, or they move by at most two steps, under a thousandth of full scale (or of their mean) |
 * | clipped | three equal samples in a row at the largest or smallest value, entered by a jump of 8 q, or at full scale |
 * | saturated | such rows make up 5 % of the recording, or the mean lies above 80 % of full scale |
 * | dropouts | 16 equal samples in a row elsewhere, with a jump of 4 q at one end, in a signal that moves by 2 q a sample |
 * | settling | the first 10 ms lie 8 deviations (of all later such means) and half an r.m.s. off, and the way back is half gone by the middle |
 * | bias-out-of-range | volts of an accelerometer whose mean is no 0 (coupled without its bias) and not 8 to 13 V |
 * | hum-only | 99 % of the power at multiples of 50 or 60 Hz, three of them standing out, no shaft speed near |
 * | ski-slope | the floor of the velocity is half of its power and rises towards the lowest lines steeper than 1/f, or like 1/f and is as low as sensor noise |
 *
 * Every threshold was set so that 1,000 simulated healthy recordings raise none (see the tests).
 */
export const qualityRules = {
  clippedRow: 3,
  clippedJumpSteps: 8,
  /** The largest integer lies one code below full scale; 8 bits have the coarsest code. */
  coarsestCode: 1 / 128,
  saturatedPart: 0.05,
  saturatedMean: 0.8,
  flatSteps: 2,
  flatPart: 1e-3,
  dropoutRow: 16,
  dropoutJumpSteps: 4,
  dropoutMeanSteps: 2,
  settlingBlockS: 0.01,
  settlingDeviations: 8,
  settlingPart: 0.5,
  settlingGone: 0.5,
  /** Below this the bias is not in the samples: the logger couples without it. */
  biasVisibleV: 1,
  biasLowV: 8,
  biasHighV: 13,
  humPart: 0.99,
  humFrequenciesHz: [50, 60],
  /** Grids keep within 0.2 Hz; the rest is for reading it off the lines. */
  humToleranceHz: 0.3,
  humLeastMultiples: 3,
  /** Lines on either side of a multiple that are counted to it. */
  humSideLines: 3,
  /** The same below the mains where no shaft speed is known: a lightly loaded two-pole motor turns 0.2 Hz slower. */
  humBelowUnknownSpeedHz: 0.12,
  /** Shafts with a multiple this near to a mains frequency cannot be told from hum. */
  humSpeedDistanceHz: 1,
  /** Two-pole motors turn up to 7 % below their mains at full load, which is the speed on their plate, and hardly below it at none. */
  humSpeedPart: 0.07,
  /** Exponent of the velocity's floor in density over frequency: 1/f in amplitude is -2. */
  skiSlopeExponent: -1.8,
  /** Steeper than the 1/f of an even acceleration: no machine's broadband vibration does that. */
  skiSlopeSteepExponent: -2.4,
  /** Highest even noise of an accelerometer, m/s² per root Hz: 1 mg. Louder 1/f is cavitation, turbulence, combustion. */
  sensorNoise: 0.01,
  skiSlopePart: 0.5,
  skiSlopeLeastAverages: 4,
  /** Lines of the lowest octave. */
  skiSlopeLeastLines: 5,
} as const;
