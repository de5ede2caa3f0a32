import { expect, it } from 'vitest';
import { tallybarProcess, whenDraining } from './process';

it('forgets a stream that has ended by itself, or every stream ever opened would be kept', () => {
	const before = tallybarProcess().whenDraining.size;
	const forget = whenDraining(() => undefined);
	expect(tallybarProcess().whenDraining.size).toBe(before + 1);
	forget();
	expect(tallybarProcess().whenDraining.size).toBe(before);
});
