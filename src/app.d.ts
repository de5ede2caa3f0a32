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
		}
	}
}

export {};
