/** Who is signed in, as far as can be known now. */
import * as z from 'zod/mini';
import { Id } from '$lib/logbook/scalars';
import { ErrorAnswer } from '$lib/logbook/wire';

const SignedIn = z.object({ id: Id, name: z.string() });
const SessionAnswer = z.object({ person: z.union([SignedIn, z.null()]) });
export type SignedIn = z.output<typeof SignedIn>;

/**
 * Asks the server who is signed in. Nobody: it names nobody, which is an answer and no refusal. That somebody who logs
 * here was signed out only a 401 of our own API says: the loop gets it with its next request, here it came of older
 * servers. A dead server, a Wi-Fi sign-in page and a proxy's error are all "unknown", and whoever was signed in last
 * still is.
 */
export async function askSession(
	request: typeof fetch = (...args) => fetch(...args)
): Promise<SignedIn | 'nobody' | 'signed_out' | 'unknown'> {
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
			return parsed.success ? (parsed.data.person ?? 'nobody') : 'unknown';
		}
		const refusal = ErrorAnswer.safeParse(value);
		const none = answer.status === 401 && refusal.data?.code === 'session.none';
		return none ? 'signed_out' : 'unknown';
	} catch {
		return 'unknown';
	}
}
