declare global {
	namespace App {
		interface Error {
			message: string;
			/** Shown to people so that they can quote it; the same id stands in the server's log. */
			requestId?: string;
		}
		interface Platform {
			req: import('node:http').IncomingMessage;
		}
		interface Locals {
			requestId: string;
			/** Who is signed in. */
			person: import('$lib/server/auth/sessions').SignedIn | null;
			/** The session, without its token. */
			session: import('$lib/server/auth/sessions').Session | null;
			/** What handleError made of something thrown, for the answer under /api. */
			failure?: import('$lib/logbook/refusals').RefusalCode;
		}
	}
}

export {};
