/** Who is signed in, as far as can be known now. */
import * as z from 'zod/mini';
import { Id } from '$lib/logbook/scalars';
import { ErrorAnswer } from '$lib/logbook/wire';

const SessionAnswer = z.object({ person: z.object({ id: Id, name: z.string() }) });
export type SignedIn = z.output<typeof SessionAnswer>['person'];

/**
 * Asks the server who is signed in. Only its own explicit word means "nobody"; a dead server, a Wi-Fi sign-in page and
 * a proxy's error are all "unknown", and then whoever was signed in last still is.
 */
export async function askSession(
	request: typeof fetch = (...args) => fetch(...args)
): Promise<SignedIn | 'nobody' | 'unknown'> {
	try {
		const answer = await request('/api/session', {
			headers: { accept: 'application/json' },
			credentials: 'same-origin',
			cache: 'no-store',
			redirect: 'manual',
			signal: AbortSignal.timeout(15_000)
		});
		const value: unknown = await answer.json();
		if (answer.ok) {
			const parsed = SessionAnswer.safeParse(value);
			return parsed.success ? parsed.data.person : 'unknown';
		}
		const refusal = ErrorAnswer.safeParse(value);
		const none = answer.status === 401 && refusal.data?.code === 'session.none';
		return none ? 'nobody' : 'unknown';
	} catch {
		return 'unknown';
	}
}
