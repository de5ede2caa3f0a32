/**
 * The example's build has the same id on every device and for ever: an address tells by it that this is the example,
 * before anything is opened. On its own, so that pages that only lead there load nothing else.
 */
export const EXAMPLE_BUILD = '0193e7a1-0000-7000-8000-00000000b111';
