/** The phases of all shifters of a chip, in radians. Plain readonly data. */
export interface Settings {
  /** One external phase per cell, in cell order. */
  readonly external: Float64Array;
  /** One internal phase theta per cell, in cell order; for a differential pair the whole theta. */
  readonly internal: Float64Array;
  /**
   * One phase per port from the top, at the outputs, or at the inputs for cells with the external phase at
   * the output; null for a chip without port shifters.
   */
  readonly port: Float64Array | null;
}
