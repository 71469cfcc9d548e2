import adapter from '@sveltejs/adapter-node';

/** @type {import('@sveltejs/kit').Config} */
export default {
	kit: {
		adapter: adapter(),
		// Our own check in hooks.server.ts replaces the built-in one: that one refuses programs that send a token and no Origin.
		csrf: { trustedOrigins: ['*'] },
		csp: {
			directives: {
				'default-src': ['self'],
				'script-src': ['self'],
				// Components place things by style attributes.
				'style-src': ['self', 'unsafe-inline'],
				'img-src': ['self', 'data:', 'blob:'],
				'font-src': ['self', 'data:'],
				'connect-src': ['self', 'blob:'],
				'worker-src': ['self', 'blob:'],
				'object-src': ['none'],
				'base-uri': ['none'],
				'form-action': ['self'],
				'frame-ancestors': ['none']
			}
		}
	}
};
