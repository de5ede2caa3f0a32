import { describe, expect, it } from 'vitest';
import { ErrorAnswer } from '../logbook/wire';
import { refuse } from './answer';

describe('a refused request', () => {
	it('says why in a code and a sentence, under the status of the catalogue', async () => {
		const response = refuse('session.other_person', { requestId: 'r1' });
		expect(response.status).toBe(409);
		const body: unknown = await response.json();
		expect(ErrorAnswer.parse(body)).toEqual(body);
		expect(body).toMatchObject({ code: 'session.other_person', requestId: 'r1' });
	});

	it('says when to try again, where there is such a time', () => {
		const response = refuse('account.throttled', { retryAfter: 60 });
		expect(response.status).toBe(429);
		expect(response.headers.get('retry-after')).toBe('60');
		expect(refuse('session.none').headers.get('retry-after')).toBeNull();
	});
});
