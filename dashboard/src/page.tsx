import { render } from 'preact';

render(<p>Nightcut</p>, document.getElementById('page')!);
