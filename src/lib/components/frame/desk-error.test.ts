import { describe, expect, it } from 'vitest';
import { deskErrorText } from './desk-error';

describe('a page of the server that could not be shown', () => {
	it('says that there is no answer, what is safe, and leads back to the build', () => {
		const error = { status: 500, answered: false, says: 'Internal Error' };
		const text = deskErrorText('/builds/b1/crew', error);
		expect(text).toMatchObject({ title: 'Crew', build: 'b1', again: true });
		expect(text.happened).toContain('no answer');
		expect(text.then.join()).toContain('kept on this device');
		expect(deskErrorText('/account', error)).toMatchObject({ title: 'Account', build: undefined });
	});

	it('says what the server said where it did', () => {
		const error = { status: 404, answered: true, says: 'There is no such build, or not for you.' };
		const text = deskErrorText('/builds/b1/crew', error);
		expect(text).toMatchObject({ happened: error.says, again: false });
		expect(text.then[0]).toContain('once its lines have gone out');
	});
});
