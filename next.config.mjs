/** @type {import('next').NextConfig} */
export default {
  poweredByHeader: false,
  reactStrictMode: true,
  serverExternalPackages: [
    '@libsql/client',
    '@node-rs/argon2',
    '@wasm-audio-decoders/ogg-vorbis',
    'opus-decoder',
    'mpg123-decoder',
    'pino',
    'pdfkit',
    'yazl',
  ],
};
