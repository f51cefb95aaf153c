/**
 * A signal of so much power, taken as a sine whose peak is `crest` times its rms, cut at a peak voltage: what power
 * is left and which share of the time is cut. Below the peak nothing changes.
 */
export function clipSine(
  power: number,
  clipPeakV: number,
  crest: number,
): { power: number; clippedShare: number } {
  const peakV = Math.sqrt(power) * crest
  if (!(peakV > clipPeakV)) return { power, clippedShare: 0 }
  const angle = Math.asin(clipPeakV / peakV)
  const cutShare = 1 - (2 / Math.PI) * angle
  // mean square of a clipped sine over its quarter period
  const below = peakV * peakV * (angle / 2 - Math.sin(2 * angle) / 4)
  const above = clipPeakV * clipPeakV * (Math.PI / 2 - angle)
  const clippedMean = ((below + above) * 2) / Math.PI
  return { power: power * (clippedMean / ((peakV * peakV) / 2)), clippedShare: cutShare }
}
