import { defineConfig } from 'vite';

// The page is plain static files: relative addresses, so that it can be served from any path.
export default defineConfig({
  root: 'dashboard',
  base: './',
  build: { outDir: '../dist/dashboard', emptyOutDir: true, target: 'es2022', chunkSizeWarningLimit: 900 },
});
