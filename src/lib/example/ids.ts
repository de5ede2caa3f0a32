/**
 * The example's build and crew have the same ids on every device and for ever: an address and a store tell by them that
 * it is the example, before anything is opened. Whoever tries it writes as its owner.
 */
import type { Member } from './crew';

export const EXAMPLE_BUILD = '0193e7a1-0000-7000-8000-00000000b111';
export const EXAMPLE_OWNER = '0193e7a1-0000-7000-8000-00000000a001';

export const EXAMPLE_CREW: readonly Member[] = [
	{ id: EXAMPLE_OWNER, name: 'Ana Verhoek', role: 'owner' },
	{ id: '0193e7a1-0000-7000-8000-00000000a002', name: 'Jo Tamsin', role: 'builder' },
	{ id: '0193e7a1-0000-7000-8000-00000000a003', name: 'Piet Aldergrove', role: 'inspector' },
	{ id: '0193e7a1-0000-7000-8000-00000000a004', name: 'Sam Verhoek', role: 'follower' }
];
