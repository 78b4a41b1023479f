"""Parts of the page as data: what each section says, before any markup."""
