package surveyfile

func (l *loader) check() {}

func (l *loader) checkFields(f *fieldList) {}
