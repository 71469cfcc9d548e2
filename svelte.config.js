import adapter from '@sveltejs/adapter-node';

/** @type {import('@sveltejs/kit').Config} */
export default {
	kit: {
		adapter: adapter(),
		// Our own check in hooks.server.ts replaces the built-in one: that one refuses programs that send a token and no Origin.
		csrf: { trustedOrigins: ['*'] }
	}
};
