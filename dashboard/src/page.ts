import { h, render } from 'preact';

render(h('p', {}, 'Nightcut'), document.getElementById('page')!);
