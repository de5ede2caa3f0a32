import { expect, it, vi } from 'vitest';
import { once } from './once';

it('runs what is asked for twice at a time once, and again when it has ended, also badly', async () => {
	let end: (error?: Error) => void = () => undefined;
	const act = vi.fn(
		(what: string) =>
			new Promise<void>((resolve, reject) => {
				end = (error) => {
					if (error) reject(error);
					else resolve();
				};
				expect(what).not.toBe('');
			})
	);
	const tap = once(act);
	const [first, second] = [tap('a'), tap('b')];
	await second;
	end();
	await first;
	expect(act.mock.calls).toEqual([['a']]);
	const third = tap('c');
	end(new Error('full'));
	await expect(third).rejects.toThrow('full');
	const fourth = tap('d');
	end();
	await fourth;
	expect(act).toHaveBeenCalledTimes(3);
});

it('keeps the browser from sending a form, also one that is sent twice', async () => {
	const tap = once((event: Event) => {
		expect(event.defaultPrevented).toBe(true);
		return Promise.resolve();
	});
	const events = [1, 2].map(() => new Event('submit', { cancelable: true }));
	await Promise.all(events.map(tap));
	expect(events.every((event) => event.defaultPrevented)).toBe(true);
});
