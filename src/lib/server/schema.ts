/**
 * The tables as the code of today sees them, one property per table. A migration never imports
 * this: it runs on the tables as they were.
 */
// eslint-disable-next-line @typescript-eslint/no-empty-object-type -- the first table comes with the first migration
export interface Database {}
