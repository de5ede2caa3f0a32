/** Holes of each seam the bench plans. */
export const HOLES = 100;
